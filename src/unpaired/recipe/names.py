"""Names that a user gives: safe as a folder on every system, and printable."""

from __future__ import annotations

import re

ALLOWED_NAME = (
    "1 to 80 letters (A-Z, a-z), digits, spaces and + - _ , ( ) . "
    "with no dot first and no space first or last"
)
_NAME = re.compile(r"(?![ .])[A-Za-z0-9 +\-_,().]{1,80}(?<! )")


def is_name(text: str) -> bool:
    """True for a name that may be a folder.

    A trailing dot is a name (`CH3.`); a trailing space is not, because nobody would see it.
    """
    return _NAME.fullmatch(text) is not None
