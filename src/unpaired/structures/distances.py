"""Distances between nuclei: who is bonded to whom, and structures that cannot be meant."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from ..errors import StructureError
from ..molecule import SYMBOLS

OVERLAP_ANGSTROM = 0.5
"""Nuclei closer than this are refused: the shortest bond of chemistry, H-H, has 0.74."""
GAP_ANGSTROM = 3.2
"""Parts farther apart than this are two molecules. Three-electron bonds and hydrogen bonds stay below it."""
BOND_STRETCH = 1.25
"""Atoms are bonded up to this multiple of the sum of their covalent radii."""
STRETCHED = 1.55
"""If every atom's nearest neighbour is beyond this multiple, the numbers are hardly in angstrom."""

# fmt: off
_RADII_ANGSTROM = (
    0.31, 0.28, 1.28, 0.96, 0.84, 0.76, 0.71, 0.66, 0.57, 0.58, 1.66, 1.41, 1.21, 1.11, 1.07, 1.05,
    1.02, 1.06, 2.03, 1.76, 1.70, 1.60, 1.53, 1.39, 1.39, 1.32, 1.26, 1.24, 1.32, 1.22, 1.22, 1.20,
    1.19, 1.20, 1.20, 1.16, 2.20, 1.95, 1.90, 1.75, 1.64, 1.54, 1.47, 1.46, 1.42, 1.39, 1.45, 1.44,
    1.42, 1.39, 1.39, 1.38, 1.39, 1.40, 2.44, 2.15, 2.07, 2.04, 2.03, 2.01, 1.99, 1.98, 1.98, 1.96,
    1.94, 1.92, 1.92, 1.89, 1.90, 1.87, 1.87, 1.75, 1.70, 1.62, 1.51, 1.44, 1.41, 1.36, 1.36, 1.32,
    1.45, 1.46, 1.48, 1.40, 1.50, 1.50,
)
# fmt: on
COVALENT_RADIUS_ANGSTROM = dict(zip(SYMBOLS, _RADII_ANGSTROM, strict=True))
"""B. Cordero et al., "Covalent radii revisited", Dalton Trans. 2008, 2832 (sp3 C; low-spin Mn, Fe, Co)."""

Where = Callable[[int], str]
"""Turns the index of an atom into words such as `line 4 (H2)`."""


def distance_matrix(coordinates: NDArray[np.float64]) -> NDArray[np.float64]:
    """All distances, shape (atoms, atoms), in the unit of the coordinates (atoms, 3)."""
    difference = coordinates[:, None, :] - coordinates[None, :, :]
    return np.asarray(np.sqrt((difference**2).sum(axis=-1)))


def _relative(elements: Sequence[str], distances: NDArray[np.float64]) -> NDArray[np.float64]:
    radii = np.array([COVALENT_RADIUS_ANGSTROM[element] for element in elements])
    relative = distances / (radii[:, None] + radii[None, :])
    np.fill_diagonal(relative, np.inf)
    return np.asarray(relative)


def neighbours(elements: Sequence[str], coordinates_angstrom: NDArray[np.float64]) -> list[tuple[int, ...]]:
    """For every atom the atoms bonded to it, by covalent radii."""
    relative = _relative(elements, distance_matrix(coordinates_angstrom))
    return [tuple(np.flatnonzero(row < BOND_STRETCH).tolist()) for row in relative]


def check_distances(elements: Sequence[str], coordinates_angstrom: NDArray[np.float64], where: Where) -> None:
    """Raise StructureError for overlapping atoms, two molecules, or numbers that are not in angstrom."""
    if len(elements) < 2:
        return
    distances = distance_matrix(coordinates_angstrom)
    others = distances + np.diag(np.full(len(elements), np.inf))
    first, second = sorted(np.unravel_index(np.argmin(others), others.shape))
    if others[first, second] < OVERLAP_ANGSTROM:
        raise StructureError(
            f"{where(int(first))} and {where(int(second))} overlap: {others[first, second]:.3f} angstrom "
            f"apart, nuclei need at least {OVERLAP_ANGSTROM}"
        )
    part = _connected(distances, GAP_ANGSTROM)
    if not part.all():
        inside, outside = np.flatnonzero(part), np.flatnonzero(~part)
        between = distances[np.ix_(inside, outside)]
        near, far = np.unravel_index(np.argmin(between), between.shape)
        raise StructureError(
            f"{where(int(outside[far]))} is {between.min():.2f} angstrom from the rest (nearest "
            f"{where(int(inside[near]))}): more than {GAP_ANGSTROM}, so these are two molecules; "
            "give one radical"
        )
    # Two atoms alone are left in peace: F2- and He2+ are that long.
    if len(elements) > 2 and (_relative(elements, distances).min(axis=1) > STRETCHED).all():
        raise StructureError(
            "every atom is more than half a bond length too far from its neighbours; "
            "coordinates are read in angstrom, are these in bohr?"
        )


def _connected(distances: NDArray[np.float64], reach: float) -> NDArray[np.bool_]:
    """Which atoms can be reached from the first by steps of at most `reach`."""
    reached: NDArray[np.bool_] = np.zeros(len(distances), dtype=bool)
    reached[0] = True
    while True:
        grown = np.asarray((distances[reached] <= reach).any(axis=0))
        if (grown == reached).all():
            return reached
        reached = np.asarray(grown)
