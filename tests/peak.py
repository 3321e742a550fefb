"""The most memory that this process has held."""

from __future__ import annotations

import resource
import sys
from pathlib import Path


def peak_bytes() -> int:
    """Largest resident size since the program of this process was started.

    Linux counts what the parent held into a child's `ru_maxrss`, so its own record of the process is read there.
    """
    status = Path("/proc/self/status")
    if status.exists():
        line = next(line for line in status.read_text().splitlines() if line.startswith("VmHWM:"))
        return int(line.split()[1]) * 1024
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * (1 if sys.platform == "darwin" else 1024)
