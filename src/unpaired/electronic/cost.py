"""How much memory and time a point will take."""

from __future__ import annotations

from typing import NamedTuple

from ..point import Point
from .duration import expected_seconds
from .settings import settings
from .sizes import MB, PROCESS_MB, Sizes, keeps_exact_integrals, sizes

SEARCH_MB = 12.0
"""What following a Hartree-Fock level downhill adds."""
MARGIN = 1.08
"""For what is not counted: 2569 MiB were used where 2449 are counted (nitroxide of 455 functions, UKS)."""
SCOUT_FUNCTIONS = 0.36
"""Functions of the scout's basis, as a share of those of pcH-1, hydrocarbons."""
SURFACE_MATRICES = 13
"""Square matrices of the surface points that exist at once while the continuum's equations are made."""


class Cost(NamedTuple):
    """The estimate for one point."""

    memory_bytes: int
    seconds: float
    basis_functions: int


def estimate(point: Point) -> Cost:
    """Peak memory and wall time of a point in a process of its own, on this machine with all its threads."""
    size = sizes(point, settings(point.level))
    return Cost(int(_memory_MB(size) * MB), expected_seconds(point, size), size.functions)


def _memory_MB(size: Sizes) -> float:
    from .continuum import BLOCK_MB
    from .continuum import KEPT_MB as SURFACE_KEPT_MB
    from .exchange import BATCH_MB
    from .grid import KEPT_MB
    from .threeindex import CHUNK_MB

    square = size.functions**2 * 8 / MB
    total = PROCESS_MB + 45 * square
    if size.fitting:
        row = size.fitting * 8 / MB
        made = row * size.pairs  # in double precision; half of it again for each order of a pair in single
        anchor = row * size.functions * size.electrons / 2
        total += 2.1 * made + anchor + min(3 * CHUNK_MB, 3 * made) + 2 * row * size.fitting
        total += min(2 * BATCH_MB, 4 * anchor)
    else:
        total += size.functions**4 / MB if keeps_exact_integrals(size.functions) else 10 * square
    for points, bytes_each in ((size.points, 8), (size.coarse_points, 4)):
        values = points * size.functions * size.share * 4 * bytes_each / MB
        total += min(values, KEPT_MB) + points * 60 * 8 / MB
    # values of the scout's functions on the coarse grid, kept in single and in double precision
    total += size.coarse_points * SCOUT_FUNCTIONS * size.functions * size.share * 4 * (4 + 8) / MB
    if not size.points:
        total += SEARCH_MB
    if size.surface:
        surface = size.surface**2 * 8 / MB
        potentials = min(size.surface * size.functions**2 / 2 * 4 / MB, SURFACE_KEPT_MB)
        total += max(SURFACE_MATRICES * surface, 6 * surface + potentials + 2 * min(BLOCK_MB, 2 * potentials))
    return PROCESS_MB + MARGIN * (total - PROCESS_MB)
