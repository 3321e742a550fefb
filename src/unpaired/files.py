"""Writing files so that a kill at any moment leaves the old file or the new one, never half of it."""

from __future__ import annotations

import contextlib
import os
import tempfile
from pathlib import Path

from .errors import StoreError


def write_atomically(path: Path, content: str | bytes) -> None:
    """Replace `path` by `content` in one step (temporary file in the same folder, fsync, rename).

    Raises StoreError with the system's reason; the old file is then still there.
    """
    data = content.encode() if isinstance(content, str) else content
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        handle, temporary = tempfile.mkstemp(dir=path.parent, prefix=".writing-")
        try:
            with os.fdopen(handle, "wb") as file:
                file.write(data)
                file.flush()
                os.fsync(file.fileno())
            os.chmod(temporary, 0o644)
            os.replace(temporary, path)
        except BaseException:
            with contextlib.suppress(OSError):
                os.unlink(temporary)
            raise
    except OSError as error:
        raise StoreError(f"{path}: cannot be written ({error.strerror or error})") from None


def require_writable(folder: Path) -> None:
    """Make sure that files can be made in `folder`, creating it if need be.

    Raises StoreError with one sentence otherwise.
    """
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            pass
    except OSError as error:
        raise StoreError(
            f"{folder}: results cannot be written there ({error.strerror or error}); give another --out"
        ) from None
