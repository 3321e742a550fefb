"""Progress on a terminal, silence in a pipe."""

from __future__ import annotations

import sys
import time
from types import TracebackType
from typing import Any


class Progress:
    """One live line on standard error while levels run; says nothing when standard error is not a terminal."""

    def __init__(self) -> None:
        self.live = sys.stderr.isatty()
        self._status: Any = None
        self._last = 0.0

    def __enter__(self) -> Progress:
        if self.live:
            from rich.console import Console

            self._status = Console(stderr=True).status("reading recipes")
            self._status.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._status is not None:
            self._status.stop()

    def show(self, text: str) -> None:
        """Replace the live line."""
        if self._status is not None and time.monotonic() - self._last > 0.1:
            self._last = time.monotonic()
            self._status.update(text)

    def print(self, text: str) -> None:
        """Print to standard output without disturbing the live line."""
        if self._status is not None:
            self._status.stop()
        sys.stdout.write(text)
        sys.stdout.flush()
        if self._status is not None:
            self._status.start()

    def say(self, text: str) -> None:
        """A sentence on standard error, terminal or not."""
        if self._status is not None:
            self._status.stop()
        sys.stderr.write(text + "\n")
        if self._status is not None:
            self._status.start()
