"""How long a point will take: counts of multiplications and integrals, and seconds for each, measured once.

The seconds were measured on one core whose rate of matrix multiplication is `SLOW_RATE`. Other machines are compared
with it by measuring that rate, which takes a tenth of a second.
"""

from __future__ import annotations

import itertools
import time
from dataclasses import replace
from functools import cache

import numpy as np

from ..errors import ChoiceError
from ..molecule import Molecule
from ..point import Point
from .search import FEW_ATOMS, SCOUT_BASIS, SCOUT_FROM, SCOUT_SHARE, SMALL_ATOMS
from .settings import SCOUT, settings
from .sizes import Sizes, basis_functions, keeps_exact_integrals, sizes
from .threads import SEVERAL_THREADS_FROM, suited_to, thread_count

SLOW_RATE = 34e9
"""Flop/s of matrix multiplication of the one core on which the seconds below were measured, one thread."""

# Seconds on that core, each fitted to measured stages of methyl, allyl and benzyl.
SECONDS_START, FUNCTIONAL_SECONDS = 0.75, 0.4
"""Loading the libraries, and those of density functionals."""
SECONDS_PER_FITTED_INTEGRAL = 9.0e-8
SECONDS_PER_EXACT_INTEGRAL = 1.1e-7
SECONDS_PER_KEPT_INTEGRAL = 6.0e-9
"""Of exact integrals kept in memory, per iteration."""
EXCHANGE_RATE, SINGLE = 18e9, 2.0
"""Flop/s of exchange in double precision, and how many times faster single precision is."""
WHOLE = 2
"""Exchange matrices made in full in double precision."""
MATRIX_SECONDS = 2.0e-6
"""Per square of the number of functions and iteration: extrapolation, diagonalisation, gradient."""
VALUE_SECONDS = 5.0e-9
"""Per function value and its derivatives, once."""
SCALE_SECONDS = 9.0e-9
"""Per function value and iteration: what is not matrix multiplication on the grid."""
GRID_RATE = 22e9
SURFACE_SECONDS = 4.0e-7
"""Per square of the number of points on a continuum's surface, once."""
POTENTIAL_SECONDS, KEPT_POTENTIAL_SECONDS = 2.6e-8, 3.0e-9
"""Per potential of a pair of functions at a point of the surface, once and per iteration."""
POINT_SECONDS = 1.3e-6
"""Per point and iteration: the functional."""
SMALL_GAIN, LARGE_GAIN = 0.2, 0.9
"""Exponents of the gain from threads, below and above `SEVERAL_THREADS_FROM` functions."""
ITERATIONS = 10
COARSE_ITERATIONS = 8
STABILITY = 1.1
"""For the stability test beside the one calculation."""
DIATOMIC_STARTS, HARD_STARTS = 10.0, 35.0
"""Other starts of every molecule of two atoms, and of those of two or three whose first answer is sure to be
contaminated (CN, NO2)."""
ALL_STARTS, SOME_STARTS, FEW_STARTS = 9.0, 2.5, 0.5
"""Other starts where all are expected; the middle of none and all where it is not known; where none are likely."""
MULTIPLE_BOND_BOHR = {"CC": 2.70, "CN": 2.60, "NN": 2.40, "NO": 2.35}
"""Atoms nearer than this to one another share more than two electrons, and then UHF is contaminated."""
START_SECONDS, FUNCTIONAL_START_SECONDS = 0.2, 0.3
"""Of one start in the scout's basis, beside its multiplications; the second with a density functional."""


def expected_seconds(point: Point, size: Sizes) -> float:
    """Wall time of a point in a process of its own, on this machine with all its threads."""
    seconds = SECONDS_START + STABILITY * _seconds(size) + _search_seconds(point)
    if point.level.is_kohn_sham:
        seconds += FUNCTIONAL_SECONDS
    gain = LARGE_GAIN if size.functions >= SEVERAL_THREADS_FROM else SMALL_GAIN
    return float(seconds * SLOW_RATE / (multiplication_rate() * thread_count() ** gain))


def _expected_starts(point: Point) -> float:
    """How many starts beside the first are likely, before anything is known of the wavefunction."""
    molecule = point.molecule
    if len(molecule.elements) == 1 or molecule.electrons == 1:
        return 0.0
    unsaturated = _has_multiple_bond(molecule)
    hard = point.level.scf == "UHF" and unsaturated
    if hard and len(molecule.elements) <= FEW_ATOMS:
        return HARD_STARTS
    if len(molecule.elements) <= SMALL_ATOMS or point.level.solution is not None:
        return DIATOMIC_STARTS
    if unsaturated and molecule.charge < 0:  # another orbital is near for the electron, whatever the method
        return ALL_STARTS
    if point.level.scf == "UHF":
        return ALL_STARTS if hard else FEW_STARTS
    return SOME_STARTS if point.level.scf == "ROHF" else 0.0


def _has_multiple_bond(molecule: Molecule) -> bool:
    places = [place for place, element in enumerate(molecule.elements) if element in ("C", "N", "O")]
    for one, other in itertools.combinations(places, 2):
        kind = "".join(sorted(molecule.elements[one] + molecule.elements[other]))
        apart_bohr = float(np.linalg.norm(molecule.coordinates_bohr[one] - molecule.coordinates_bohr[other]))
        if apart_bohr < MULTIPLE_BOND_BOHR.get(kind, 0.0):
            return True
    return False


def _search_seconds(point: Point) -> float:
    """What other starts are expected to take: all are made in the scout's basis where there is one."""
    starts = _expected_starts(point)
    if not starts:
        return 0.0
    small = replace(point, level=replace(point.level, basis=SCOUT_BASIS, accuracy="quick"))
    own = basis_functions(point)
    try:
        with_scout = own >= SCOUT_FROM and basis_functions(small) <= SCOUT_SHARE * own
    except ChoiceError:
        with_scout = False
    where = sizes(small, SCOUT) if with_scout else sizes(point, settings(point.level))
    each = FUNCTIONAL_START_SECONDS if point.level.is_kohn_sham else START_SECONDS
    return starts * (each + _seconds(where))


def _seconds(size: Sizes) -> float:
    """One calculation from start to convergence, on the core of `SLOW_RATE`."""
    n = float(size.functions)
    iterations = ITERATIONS + (COARSE_ITERATIONS if size.fitting else 0)
    if size.fitting:
        seconds = SECONDS_PER_FITTED_INTEGRAL * size.fitting * size.pairs
        half = 4.0 * size.fitting * size.pairs * size.electrons
        outer = float(size.fitting) * n**2 * size.electrons
        near = half + 4.0 * size.fitting * n * size.electrons**2
        seconds += WHOLE * (half + outer) / EXCHANGE_RATE
        seconds += (COARSE_ITERATIONS * (half + outer) + ITERATIONS * near) / (SINGLE * EXCHANGE_RATE)
    else:
        once = SECONDS_PER_EXACT_INTEGRAL * n**4 / 8
        if keeps_exact_integrals(size.functions):
            seconds = once + iterations * SECONDS_PER_KEPT_INTEGRAL * n**4 / 8
        else:
            seconds = iterations * once
    potentials = size.surface * n**2 / 2
    seconds += SURFACE_SECONDS * size.surface**2 + POTENTIAL_SECONDS * potentials
    seconds += iterations * KEPT_POTENTIAL_SECONDS * potentials
    seconds += iterations * MATRIX_SECONDS * n**2
    for points, passes in ((size.points, ITERATIONS), (size.coarse_points, COARSE_ITERATIONS)):
        values = points * n * size.share
        flops = values * (8 * size.electrons + 4 * n * size.share)
        seconds += values * VALUE_SECONDS
        seconds += passes * (flops / GRID_RATE + values * SCALE_SECONDS + points * POINT_SECONDS)
    return seconds


@cache
def multiplication_rate() -> float:
    """Flop/s of matrix multiplication here and now, one thread: best of five, a tenth of a second in all."""
    left = np.random.default_rng(0).normal(size=(700, 700))
    times = []
    with suited_to(1):
        for _ in range(5):
            started = time.perf_counter()
            left @ left
            times.append(time.perf_counter() - started)
    return float(2 * 700**3 / min(times))
