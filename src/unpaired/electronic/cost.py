"""How much memory and time a point will take."""

from __future__ import annotations

from typing import NamedTuple

from .. import catalogue
from ..point import Point

START_BYTES = 250_000_000
"""Python with PySCF loaded."""


class Cost(NamedTuple):
    """The estimate for one point."""

    memory_bytes: int
    seconds: float
    basis_functions: int


def basis_functions(point: Point) -> int:
    """Number of spherical basis functions of a point."""
    total = 0
    for element in point.molecule.elements:
        for shell in catalogue.basis_for(point.level.basis, element):
            rows = [row for row in shell[1:] if isinstance(row, list | tuple)]
            total += (2 * shell[0] + 1) * (len(rows[0]) - 1)
    return total


def estimate(point: Point) -> Cost:
    """Memory from the largest arrays; time from the cubic growth seen on one machine, a first guess."""
    functions = basis_functions(point)
    fitted = 3 * functions * functions * (functions + 1) // 2 * 8
    return Cost(
        START_BYTES + fitted + 40 * functions**2 * 8, 1.0 + 60.0 * (functions / 245) ** 2.3, functions
    )
