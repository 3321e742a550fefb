"""A measured spectrum from a text file of two columns, as instruments and spreadsheets leave it."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError

FloatArray = NDArray[np.float64]

FEWEST_POINTS = 8
UNITS = {"mT": 1.0, "T": 1e3, "G": 0.1, "Gauss": 0.1, "gauss": 0.1, "MHz": 1.0, "GHz": 1e3}
"""Unit in a heading to mT or MHz."""
FREQUENCIES = ("MHz", "GHz")
_FIELD_UNIT = re.compile(
    r"(?:^(?=\w+\s*(?:[;,\t]|$))|[\[(/_,;]|\b[Ff]ield|\bB)\s*(mT|T|Gauss|gauss|G)(?![A-Za-z])", re.ASCII
)
_FREQUENCY_UNIT = re.compile(r"[Ff]req\w*?[\s_\[(/,]*(MHz|GHz)(?![A-Za-z])", re.ASCII)
_NUMBER = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)([eEdD][+-]?\d+)?")


@dataclass(frozen=True, eq=False)
class MeasuredCurve:
    """What was read."""

    axis: str
    """`field_mT` or `frequency_MHz`."""
    position: FloatArray
    """mT or MHz, ascending, each once."""
    signal: FloatArray
    heading_lines: int
    """Lines above the numbers that were taken as headings."""
    unit_note: str
    """Which unit the file's first column was taken to have, and why."""


def read_measured_curve(path: str | Path) -> MeasuredCurve:
    """Read a file of two columns: blanks, tabs, semicolons or commas between; decimal points or commas.

    Before the first pair of numbers, lines that do not begin with a number or hold nothing but one are
    headings; empty lines and lines that begin with # or % do not count. A unit in the headings is obeyed (mT, T,
    G, Gauss; a frequency in MHz or GHz), else the first column is in mT. Descending sweeps are turned round;
    repeated positions are averaged. Raises InputError with file and line.
    """
    place = Path(path)
    try:
        raw = place.read_bytes()
    except OSError as error:
        raise InputError(f"{place}: cannot be read ({error.strerror})") from None
    text = _decoded(raw).replace("\N{MINUS SIGN}", "-")
    headings: list[str] = []
    rows: list[tuple[float, float]] = []
    separator: str | None = None
    for number, line in enumerate(text.splitlines(), start=1):
        content = line.strip().replace('"', "")
        if not content:
            continue
        if content[0] in "#%":
            headings += [] if rows else [content]
            continue
        if not rows and _is_heading(content):
            headings.append(content)
            continue
        if not rows:
            separator = _separator(content)
        rows.append(_row(content, separator, f"{place}:{number}"))
    if len(rows) < FEWEST_POINTS:
        raise InputError(
            f"{place}: holds {len(rows)} lines of two numbers; a spectrum needs at least {FEWEST_POINTS}"
        )
    unit = _unit(headings)
    values = np.array(rows)
    position, place_of = np.unique(values[:, 0] * UNITS[unit or "mT"], return_inverse=True)
    if len(position) < FEWEST_POINTS:
        raise InputError(f"{place}: the first column hardly changes ({len(position)} different values)")
    signal = np.bincount(place_of, weights=values[:, 1]) / np.bincount(place_of)
    if np.ptp(signal) == 0:
        raise InputError(f"{place}: the second column is constant: there is no signal to compare with")
    return MeasuredCurve(
        axis="frequency_MHz" if unit in FREQUENCIES else "field_mT",
        position=position,
        signal=signal,
        heading_lines=len(headings),
        unit_note=f"first column in {unit} by its heading"
        if unit
        else "first column taken as mT (no heading says)",
    )


def _decoded(raw: bytes) -> str:
    encoding = "utf-16" if raw[:2] in (b"\xff\xfe", b"\xfe\xff") else "utf-8-sig"
    try:
        return raw.decode(encoding)
    except UnicodeDecodeError:
        return raw.decode("latin-1")


def _is_heading(line: str) -> bool:
    """Whether a line above the numbers is none of them: a name, a date, the number of points."""
    parts = [part for part in line.rstrip(";, \t").split(_separator(line)) if part.strip()]
    return len(parts) < 2 or not _NUMBER.fullmatch(parts[0].strip())


def _separator(line: str) -> str | None:
    """What stands between the numbers of the first line: `;`, `,`, or None for blanks and tabs."""
    if ";" in line:
        return ";"
    if len(line.split()) > 1 and not re.search(r",\s", line):
        return None
    return "," if "," in line else None


def _row(line: str, separator: str | None, address: str) -> tuple[float, float]:
    parts = [part.strip() for part in line.rstrip(";, \t").split(separator)]
    if len(parts) != 2:
        how = {";": "semicolons", ",": "commas", None: "blanks"}[separator]
        hint = (
            "; with decimal commas, separate the columns by semicolons or blanks" if separator == "," else ""
        )
        raise InputError(f"{address}: two numbers are expected, found {len(parts)} between {how}{hint}")
    return _number(parts[0], address), _number(parts[1], address)


def _number(text: str, address: str) -> float:
    if _NUMBER.fullmatch(text):
        value = float(re.sub("[dD]", "e", text).replace(",", "."))
        if math.isfinite(value):
            return value
    raise InputError(f'{address}: "{text}" is not a number')


def _unit(headings: Sequence[str]) -> str | None:
    """The first unit in the heading nearest to the numbers that names one."""
    for heading in reversed(headings):
        for pattern in (_FREQUENCY_UNIT, _FIELD_UNIT):
            found = pattern.search(heading.lstrip("#% "))
            if found:
                return found.group(1)
    return None
