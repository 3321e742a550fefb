"""A starting density near the answer, converged in a small basis and projected."""

from __future__ import annotations

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

ROUGH_ENERGY_Eh = 1e-5
ROUGH_GRADIENT = 1e-3
ROUGH_CYCLES = 40
"""Thresholds in the small basis: below the change that the larger one makes."""
WORTH_IT = 2.0
"""A small-basis start is made where the basis has this many times more functions than the small one."""


def initial_density(point: Point, mole: Any, settings: Settings) -> NDArray[np.float64]:
    """Alpha and beta density matrices to start a field of this point from, shape (2, functions, functions).

    From the level's own method in `start_basis`; a superposition of atoms where that basis lacks an element, saves
    nothing or does not converge.
    """
    density = _from_small_basis(point, mole, settings)
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
    grid = settings.grid_level if settings.start_grid_level is None else settings.start_grid_level
    rough = replace(
        settings,
        grid_level=grid,
        start_grid_level=None,
        energy_tolerance_Eh=ROUGH_ENERGY_Eh,
        gradient_tolerance=ROUGH_GRADIENT,
        max_iterations=ROUGH_CYCLES,
    )
    field = mean_field(small, point.level, point.solvent, rough)
    field.kernel()
    return project(small, mole, np.asarray(field.make_rdm1()), mole.nelec) if field.converged else None


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
