"""What this machine has: cores and memory."""

from __future__ import annotations

import os
from pathlib import Path


def cores() -> int:
    """Cores that this process may use; OMP_NUM_THREADS lowers it."""
    try:
        allowed = len(os.sched_getaffinity(0))
    except AttributeError:  # macOS
        allowed = os.cpu_count() or 1
    asked = os.environ.get("OMP_NUM_THREADS", "")
    return min(allowed, int(asked)) if asked.isdigit() and int(asked) > 0 else allowed


def memory_bytes() -> int:
    """Memory that can be used now: available in the system, and within a container's limit."""
    bounds = [os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES")]
    meminfo = Path("/proc/meminfo")
    if meminfo.exists():
        for line in meminfo.read_text().splitlines():
            if line.startswith("MemAvailable:"):
                bounds.append(int(line.split()[1]) * 1024)
    limit = Path("/sys/fs/cgroup/memory.max")
    used = Path("/sys/fs/cgroup/memory.current")
    if limit.exists() and used.exists() and limit.read_text().strip().isdigit():
        bounds.append(int(limit.read_text()) - int(used.read_text()))
    return max(min(bounds), 0)
