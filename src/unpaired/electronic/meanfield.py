"""PySCF's mean-field object for a level: method, functional, fitting, grid, continuum."""

from __future__ import annotations

from typing import Any

from ..level import Level
from ..point import Solvent
from .frame import turned_grids
from .settings import Settings

EXACT_INTEGRALS_MB = 8000
"""Exact integrals are kept in memory up to this size, and computed anew in every iteration above it."""


def mean_field(mole: Any, level: Level, solvent: Solvent | None, settings: Settings) -> Any:
    """An unconverged mean-field object. Fitted first, continuum next: the other order refuses gradients.

    Its grid sums and fitted contractions are this package's; all else, with what it hands on to gradients,
    Hessians and second-order methods, is the library's.
    """
    from pyscf import dft, scf

    from .auxiliary import auxiliary_basis
    from .fitting import Fitting
    from .grid import GridIntegration
    from .staged import staged

    scf.hf.MUTE_CHKFILE = True  # no checkpoint files: what is worth keeping goes to the store
    # the classes themselves: scf.UHF(mole) of one electron is a shortcut that ignores a continuum
    kinds = {"UHF": scf.uhf.UHF, "ROHF": scf.rohf.ROHF, "UKS": dft.uks.UKS, "ROKS": dft.roks.ROKS}
    field = kinds[level.scf](mole)
    if level.is_kohn_sham:
        field.xc = level.functional
        field.grids = turned_grids(mole, settings.grid_level)
        field._numint = GridIntegration()
    if settings.fitting_set is not None:
        elements = {mole.atom_pure_symbol(place) for place in range(mole.natm)}
        shells = {element: auxiliary_basis(settings.fitting_set, element) for element in elements}
        field = field.density_fit(with_df=Fitting(mole, shells))
    else:
        field.max_memory = EXACT_INTEGRALS_MB
    if solvent is not None:
        from .continuum import Continuum

        field = field.PCM(Continuum(mole, solvent.dielectric))
    if settings.fitting_set is not None or (level.is_kohn_sham and settings.start_grid_level is not None):
        field = staged(field, settings.start_grid_level if level.is_kohn_sham else None)
    field.conv_tol = settings.energy_tolerance_Eh
    field.conv_tol_grad = settings.gradient_tolerance
    field.max_cycle = settings.max_iterations
    return field
