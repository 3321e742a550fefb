"""A starting density near the answer, from where iterations are cheap: a small basis, then a coarse grid."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .. import catalogue
from ..errors import ChoiceError
from ..point import Point
from .meanfield import mean_field
from .mole import build_mole
from .settings import Settings

Watch = Callable[[dict[str, Any]], None]

ROUGH_ENERGY_Eh = 1e-5
ROUGH_GRADIENT = 1e-3
"""Thresholds of the start: below the change that the next, better stage makes."""
ROUGH_CYCLES = 40
WORTH_IT = 2.0
"""A small-basis start is made where the basis has this many times more functions than the small one."""


def initial_density(
    point: Point, mole: Any, settings: Settings, watch: Watch | None = None
) -> NDArray[np.float64]:
    """Alpha and beta density matrices to start a field of this point from, shape (2, functions, functions).

    A stage that does not converge hands on nothing, and the stage after it starts as if it had not been.
    """
    density = _from_small_basis(point, mole, settings)
    if point.level.is_kohn_sham and settings.start_grid_level is not None:
        rough = _rough_field(point, mole, settings)
        rough.callback = watch
        rough.kernel(dm0=density)
        if rough.converged:
            density = np.asarray(rough.make_rdm1())
    if density is None:
        density = np.asarray(mean_field(mole, point.level, None, settings).get_init_guess())
    return density


def _from_small_basis(point: Point, mole: Any, settings: Settings) -> NDArray[np.float64] | None:
    """Converged densities of a small basis in the basis of `mole`; None if there is no use in it."""
    if settings.start_basis is None:
        return None
    try:
        catalogue.check_basis(settings.start_basis, point.molecule.elements)
    except ChoiceError:
        return None
    small_point = replace(point, level=replace(point.level, basis=settings.start_basis))
    small = build_mole(small_point)
    if WORTH_IT * small.nao > mole.nao:
        return None
    rough = _rough_field(small_point, small, settings)
    rough.kernel()
    if not rough.converged:
        return None
    return project(small, mole, np.asarray(rough.make_rdm1()), mole.nelec)


def _rough_field(point: Point, mole: Any, settings: Settings) -> Any:
    grid = settings.grid_level if settings.start_grid_level is None else settings.start_grid_level
    rough = replace(
        settings,
        grid_level=grid,
        energy_tolerance_Eh=ROUGH_ENERGY_Eh,
        gradient_tolerance=ROUGH_GRADIENT,
        max_iterations=ROUGH_CYCLES,
    )
    return mean_field(mole, point.level, point.solvent, rough)


def project(
    small: Any, mole: Any, densities: NDArray[np.float64], electrons: tuple[int, int]
) -> NDArray[np.float64]:
    """Idempotent densities of `mole` nearest to those of `small`: shape (2, functions, functions).

    The occupied natural orbitals of each spin are written in the new basis by least squares, S C' = X C;
    their space, made orthonormal, is the new density.
    """
    from pyscf import gto

    overlap = mole.intor("int1e_ovlp")
    cross = gto.intor_cross("int1e_ovlp", mole, small)
    inner = small.intor("int1e_ovlp")
    root = np.linalg.cholesky(inner)
    projected = []
    for density, count in zip(densities, electrons, strict=True):
        _, vectors = np.linalg.eigh(root.T @ density @ root)
        orbitals = np.linalg.solve(root.T, vectors[:, -count:]) if count else np.zeros((small.nao, 0))
        orbitals = np.linalg.solve(overlap, cross @ orbitals)
        metric = orbitals.T @ overlap @ orbitals
        projected.append(orbitals @ np.linalg.solve(metric, orbitals.T) if count else np.zeros_like(overlap))
    return np.array(projected)
