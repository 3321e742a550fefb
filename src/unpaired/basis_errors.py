"""How far basis sets are off at the nucleus: a table that the project makes itself, and what it says of a level.

The table compares spin densities at the nuclei with those of pcH-4; `python -m unpaired.basis_table` makes it.
"""

from __future__ import annotations

import csv
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from importlib import resources

from .flag import Flag, Severity
from .point import Point

FILE = "basis-contact-errors.csv"
COLUMNS = ("basis", "system", "nucleus", "method", "error_percent")

CAUTION_PERCENT = 15.0
BAD_PERCENT = 50.0


@dataclass(frozen=True)
class BasisError:
    """Error of a basis set at one nucleus of one test system."""

    basis: str
    system: str
    """In words, such as `planar CH3`."""
    nucleus: str
    """Element symbol."""
    error_percent: float
    """Of the limit; below -100 the sign is wrong."""

    def in_words(self) -> str:
        """Such as `N of the N atom 118 % low, wrong sign`."""
        size = abs(self.error_percent)
        digits = f"{size:.0f}" if size >= 10 else f"{size:.1f}"
        words = f"{self.nucleus} of {self.system} {digits} % {'low' if self.error_percent < 0 else 'high'}"
        return words + (", wrong sign" if self.error_percent < -100 else "")


def basis_error_flags(point: Point, isotopes: Sequence[str | None]) -> list[Flag]:
    """What the table says of the level's basis set, for the elements whose nuclei are coupled.

    One note for the level, and caution or bad on every atom of an element that is far off.
    """
    molecule, level = point.molecule, point.level
    coupled = {element for element, name in zip(molecule.elements, isotopes, strict=True) if name is not None}
    known = [entry for entry in table() if entry.basis == level.basis and entry.nucleus in coupled]
    if not known:
        return []
    worst = max(known, key=lambda entry: abs(entry.error_percent))
    words = "; ".join(entry.in_words() for entry in known)
    advice = f"error of {level.basis} at the nucleus against the limit of large basis sets: {words}"
    flags = [Flag("basis-at-nucleus", "note", advice, worst.error_percent, None, level.id)]
    for label, element in zip(molecule.labels, molecule.elements, strict=True):
        errors = [entry for entry in known if entry.nucleus == element]
        if not errors:
            continue
        worst = max(errors, key=lambda entry: abs(entry.error_percent))
        size = abs(worst.error_percent)
        if size >= CAUTION_PERCENT:
            severity: Severity = "bad" if size >= BAD_PERCENT else "caution"
            flags.append(
                Flag(
                    "basis-at-nucleus",
                    severity,
                    f"{level.basis}: {worst.in_words()}; take pcH-1 or pcH-2",
                    worst.error_percent,
                    BAD_PERCENT if severity == "bad" else CAUTION_PERCENT,
                    level.id,
                    label,
                )
            )
    return flags


@cache
def table() -> tuple[BasisError, ...]:
    """The shipped table."""
    text = resources.files(__package__).joinpath("data", FILE).read_text(encoding="utf-8")
    return tuple(
        BasisError(row["basis"], row["system"], row["nucleus"], float(row["error_percent"]))
        for row in csv.DictReader(text.splitlines())
    )
