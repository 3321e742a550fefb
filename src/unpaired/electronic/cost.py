"""How much memory and time a point will take: sizes of the arrays, counts of the multiplications."""

from __future__ import annotations

import time
from dataclasses import dataclass
from functools import cache
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from .. import catalogue
from ..point import Point
from .auxiliary import auxiliary_size
from .settings import Settings, settings

MB = 1_000_000
PROCESS_MB = 150.0
"""Python with PySCF loaded."""
SLOW_RATE = 34e9
"""Flop/s of matrix multiplication of the one core on which the seconds below were measured."""

# Seconds on that core, each fitted to measured stages of methyl, allyl and benzyl.
SECONDS_START = 0.6
SECONDS_PER_FITTED_INTEGRAL = 9.0e-8
SECONDS_PER_EXACT_INTEGRAL = 1.1e-7
SECONDS_PER_KEPT_INTEGRAL = 6.0e-9
"""Of exact integrals kept in memory, per iteration."""
EXCHANGE_RATE = 18e9
MATRIX_SECONDS = 2.0e-6
"""Per square of the number of functions and iteration: extrapolation, diagonalisation, gradient."""
VALUE_SECONDS = 5.0e-9
"""Per function value and its derivatives, once."""
SCALE_SECONDS = 9.0e-9
"""Per function value and iteration: what is not matrix multiplication on the grid."""
GRID_RATE = 22e9
POINT_SECONDS = 1.3e-6
"""Per point and iteration: the functional."""
BLOCK_GAIN = 1.55
"""Functions that reach some point of a block, over those that reach one point; as measured."""
THREADS_GAIN = 0.8
"""Exponent of the gain from a faster machine: some work does not run in threads."""
ITERATIONS = 10
COARSE_ITERATIONS = 8
SEARCH = 1.3
"""For starts and stability tests beside the one calculation."""

SEARCH_MEMORY = 1.15
"""For what other starts and stability tests keep beside it."""
SEARCH_MB = 80.0
"""What a search for other states adds to a Hartree-Fock level: it tries Kohn-Sham states in a small basis."""


class Cost(NamedTuple):
    """The estimate for one point."""

    memory_bytes: int
    seconds: float
    basis_functions: int


@dataclass(frozen=True)
class Sizes:
    """What decides memory and time."""

    functions: int
    electrons: int
    fitting: int
    """Fitting functions; 0 for exact integrals."""
    points: int
    """Points of the final grid; 0 for Hartree-Fock."""
    coarse_points: int
    share: float
    """Share of the functions that reach a block of points."""


def basis_functions(point: Point) -> int:
    """Number of spherical basis functions of a point."""
    return sum(_size(catalogue.basis_for(point.level.basis, e)) for e in point.molecule.elements)


def estimate(point: Point) -> Cost:
    """Peak memory and wall time of a point in a process of its own, on this machine with all its threads."""
    setting = settings(point.level)
    size = sizes(point, setting)
    seconds = SECONDS_START + SEARCH * _seconds(size, setting)
    speed = (multiplication_rate() / SLOW_RATE) ** THREADS_GAIN
    return Cost(int(_memory_MB(size, setting) * MB), seconds / speed, size.functions)


def sizes(point: Point, setting: Settings) -> Sizes:
    """The counts of a point."""
    elements = point.molecule.elements
    fitting = sum(auxiliary_size(setting.fitting_set, e) for e in elements) if setting.fitting_set else 0
    points = coarse = 0
    if point.level.is_kohn_sham:
        points = sum(len(_atomic_points(e, setting.grid_level)) for e in elements)
        if setting.start_grid_level is not None:
            coarse = sum(len(_atomic_points(e, setting.start_grid_level)) for e in elements)
    share = _share(point) if points else 0.0
    return Sizes(basis_functions(point), point.molecule.electrons, fitting, points, coarse, share)


def _memory_MB(size: Sizes, setting: Settings) -> float:
    from .fitting import BATCH_MB, BUFFER_MB
    from .grid import KEPT_MB
    from .meanfield import EXACT_INTEGRALS_MB

    square = size.functions**2 * 8 / MB
    total = 45 * square
    if size.fitting:
        integrals = size.fitting * square / 2 + size.fitting**2 * 8 / MB
        batch = min(BATCH_MB, size.fitting * square)
        total += integrals + max(min(BUFFER_MB, 3 * integrals), batch * (1 + size.electrons / size.functions))
    else:
        kept = float(size.functions) ** 4 / MB
        total += kept if kept < 0.95 * EXACT_INTEGRALS_MB - PROCESS_MB else 10 * square
    for points in (size.points, size.coarse_points):
        values = points * size.functions * size.share * 4 * 8 / MB
        total += min(values, KEPT_MB) + points * 60 * 8 / MB
    return PROCESS_MB + SEARCH_MEMORY * total + (0 if size.points else SEARCH_MB)


def _seconds(size: Sizes, setting: Settings) -> float:
    """One calculation from start to convergence, on the core of `SLOW_RATE`."""
    n = float(size.functions)
    iterations = ITERATIONS + (COARSE_ITERATIONS if size.coarse_points else 0)
    if size.fitting:
        seconds = SECONDS_PER_FITTED_INTEGRAL * size.fitting * n**2 / 2
        seconds += iterations * 3 * size.fitting * n**2 * size.electrons / EXCHANGE_RATE
    else:
        from .meanfield import EXACT_INTEGRALS_MB

        fits = n**4 < (0.95 * EXACT_INTEGRALS_MB - PROCESS_MB) * MB
        once = SECONDS_PER_EXACT_INTEGRAL * n**4 / 8
        seconds = once + iterations * SECONDS_PER_KEPT_INTEGRAL * n**4 / 8 if fits else iterations * once
    seconds += iterations * MATRIX_SECONDS * n**2
    for points, passes in ((size.points, ITERATIONS), (size.coarse_points, COARSE_ITERATIONS)):
        values = points * n * size.share
        flops = values * (8 * size.electrons + 4 * n * size.share)
        seconds += values * VALUE_SECONDS
        seconds += passes * (flops / GRID_RATE + values * SCALE_SECONDS + points * POINT_SECONDS)
    return seconds


@cache
def multiplication_rate() -> float:
    """Flop/s of matrix multiplication here and now: best of five, a tenth of a second in all."""
    left = np.random.default_rng(0).normal(size=(700, 700))
    times = []
    for _ in range(5):
        started = time.perf_counter()
        left @ left
        times.append(time.perf_counter() - started)
    return float(2 * 700**3 / min(times))


@cache
def _atomic_points(element: str, level: int) -> NDArray[np.float64]:
    """Points of an element's grid around its nucleus, bohr, shape (points, 3)."""
    from pyscf import dft, gto

    atom = gto.M(atom=[[element, (0.0, 0.0, 0.0)]], basis={element: [[0, [1.0, 1.0]]]}, spin=None, verbose=0)
    tables = dft.gen_grid.gen_atomic_grids(atom, level=level)
    return np.asarray(next(iter(tables.values()))[0])


def _share(point: Point) -> float:
    """Root mean square share of the functions that reach a block of points, from a sample of points."""
    from .grid import REACH
    from .mole import build_mole

    elements, centres = point.molecule.elements, point.molecule.coordinates_bohr
    sample = [_atomic_points(e, 0)[::37] + centre for e, centre in zip(elements, centres, strict=True)]
    values = build_mole(point).eval_gto("GTOval_sph", np.vstack(sample))
    shares = (np.abs(values) > REACH).mean(axis=1)
    return min(1.0, BLOCK_GAIN * float(np.sqrt(np.mean(np.square(shares)))))


def _size(shells: list[Any]) -> int:
    total = 0
    for shell in shells:
        rows = [row for row in shell[1:] if isinstance(row, list | tuple)]
        total += (2 * shell[0] + 1) * (len(rows[0]) - 1)
    return total
