"""XYZ files: number of atoms, a comment, then element and three coordinates in angstrom per line."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np

from ..constants import BOHR_ANGSTROM
from ..errors import StructureError, nearest
from ..molecule import ATOMIC_NUMBER, Molecule
from .distances import check_distances
from .geometry import Geometry, structure_text

__all__ = ["Geometry", "element_symbol", "parse_xyz", "read_xyz", "xyz_text"]

_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?")
_HEAVY_HYDROGEN = {"D": "2H", "T": "3H"}
_LARGEST_ANGSTROM = 1e4


def read_xyz(path: str | Path) -> Geometry:
    """Read one structure from an XYZ file.

    Raises StructureError with file and line for a file that cannot be read, a wrong count, an unknown
    element, a coordinate that is not a number, overlapping atoms, two separate molecules.
    """
    return parse_xyz(structure_text(path), str(path))


def parse_xyz(text: str, name: str) -> Geometry:
    """The structure in the text of an XYZ file; `name` stands in error messages."""
    lines = text.split("\n")
    count_text = lines[0].strip()
    if not (count_text.isascii() and count_text.isdigit() and int(count_text) > 0):
        raise StructureError(f'{name}:1: the number of atoms is expected, found "{count_text[:40]}"')
    count = int(count_text)
    rows = lines[2:]
    while rows and not rows[-1].strip():
        rows.pop()
    if len(rows) != count:
        line = len(rows) + 3 if len(rows) < count else count + 3
        what = "the file ends after" if len(rows) < count else "one structure per file; there are"
        raise StructureError(f"{name}:{line}: line 1 says {count} atoms, {what} {len(rows)} lines of atoms")
    elements: list[str] = []
    coordinates: list[list[float]] = []
    for number, row in enumerate(rows, start=3):
        fields = row.split()
        if len(fields) != 4:
            raise StructureError(
                f'{name}:{number}: an element and three coordinates are expected, found "{row.strip()[:60]}"'
            )
        elements.append(element_symbol(fields[0], f"{name}:{number}"))
        coordinates.append([_coordinate(field, f"{name}:{number}") for field in fields[1:]])
    angstrom = np.array(coordinates)
    try:
        check_distances(elements, angstrom, lambda atom: f"line {atom + 3} ({elements[atom]}{atom + 1})")
    except StructureError as error:
        raise StructureError(f"{name}: {error.message}") from None
    return Geometry(tuple(elements), angstrom / BOHR_ANGSTROM, lines[1].strip())


def element_symbol(text: str, where: str) -> str:
    """`cl`, `CL` and `Cl` are Cl. Raises StructureError, starting with `where`, for what is no element."""
    symbol = text.capitalize()
    if symbol in ATOMIC_NUMBER:
        return symbol
    if symbol in _HEAVY_HYDROGEN:
        raise StructureError(
            f"{where}: write H for {text} and name the isotope in the recipe "
            f"(isotopes: {{H1: {_HEAVY_HYDROGEN[symbol]}}})"
        )
    hint = nearest(text, ATOMIC_NUMBER) if text.isalpha() else "; a symbol such as C is expected"
    raise StructureError(f'{where}: unknown element "{text[:20]}"{hint}')


def _coordinate(text: str, where: str) -> float:
    if not _NUMBER.fullmatch(text) or abs(float(text)) > _LARGEST_ANGSTROM:
        raise StructureError(f'{where}: a coordinate in angstrom is expected, found "{text[:30]}"')
    return float(text)


def xyz_text(molecule: Molecule | Geometry, comment: str) -> str:
    """The molecule as an XYZ file, coordinates in angstrom to 1e-10, comment on one line."""
    angstrom = molecule.coordinates_bohr * BOHR_ANGSTROM
    rows = [
        f"{element:<2} {x:16.10f} {y:16.10f} {z:16.10f}"
        for element, (x, y, z) in zip(molecule.elements, angstrom + 0.0, strict=True)
    ]
    return "\n".join([str(len(rows)), " ".join(comment.split()), *rows]) + "\n"
