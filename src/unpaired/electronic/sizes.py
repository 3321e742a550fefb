"""Counts of a point that decide memory and time: functions, fitting functions, points of grids and surface."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .. import catalogue
from ..point import Point
from .auxiliary import auxiliary_size
from .settings import Settings

MB = 1_000_000
PROCESS_MB = 143.0
"""Python with PySCF loaded."""
BLOCK_GAIN = 1.55
"""Functions that reach some point of a block, over those that reach one point; as measured."""


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
    surface: int = 0
    """Points of the continuum's surface."""
    pairs: int = 0
    """Pairs of functions with fitted integrals."""


def basis_functions(point: Point) -> int:
    """Number of spherical basis functions of a point."""
    return sum(_size(catalogue.basis_for(point.level.basis, e)) for e in point.molecule.elements)


def keeps_exact_integrals(functions: int) -> bool:
    """Whether exact integrals stay in memory from iteration to iteration."""
    from .meanfield import EXACT_INTEGRALS_MB

    return functions**4 / MB < 0.95 * EXACT_INTEGRALS_MB - PROCESS_MB


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
    surface = _surface_points(point) if point.solvent is not None else 0
    pairs = _pairs(point) if fitting else 0
    electrons = point.molecule.electrons
    return Sizes(basis_functions(point), electrons, fitting, points, coarse, share, surface, pairs)


def _pairs(point: Point) -> int:
    from .mole import build_mole
    from .threeindex import overlapping

    kept = overlapping(build_mole(point))
    return int(kept.sum() + len(kept)) // 2


def _surface_points(point: Point) -> int:
    """Points of the spheres around the nuclei that no other sphere covers."""
    from .continuum import Continuum
    from .mole import build_mole

    return Continuum(build_mole(point), 1.0).surface_points()


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
