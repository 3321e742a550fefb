"""RDKit's messages as text instead of noise on standard error."""

from __future__ import annotations

import contextlib
import logging
from collections.abc import Iterator


class _Collector(logging.Handler):
    def __init__(self, messages: list[str]) -> None:
        super().__init__()
        self.messages = messages

    def emit(self, record: logging.LogRecord) -> None:
        text = record.getMessage().strip()
        # RDKit puts a time stamp in brackets before its sentence.
        self.messages.append(text.split("] ", 1)[-1] if text.startswith("[") else text)


@contextlib.contextmanager
def rdkit_messages() -> Iterator[list[str]]:
    """Collect what RDKit would print while the block runs."""
    from rdkit import rdBase

    messages: list[str] = []
    logger = logging.getLogger("rdkit")
    handler = _Collector(messages)
    before = (logger.level, logger.propagate, list(logger.handlers))
    rdBase.LogToPythonLogger()
    logger.handlers = [handler]
    logger.propagate = False
    logger.setLevel(logging.INFO)
    try:
        yield messages
    finally:
        logger.level, logger.propagate, logger.handlers = before
        rdBase.LogToCppStreams()
