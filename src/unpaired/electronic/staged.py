"""Fields that converge roughly first: most iterations need neither a fine grid nor double precision."""

from __future__ import annotations

from contextlib import nullcontext
from typing import Any

import numpy as np
from pyscf import lib

from .frame import turned_grids

ROUGH_ENERGY_Eh = 1e-4
ROUGH_GRADIENT = 3e-3
"""Where the rough stage has done its part: about the gradient that the change of grids brings in."""
ROUGH_CYCLES = 40


class Staged:
    """Mixin for a fitted or Kohn-Sham object: its SCF from a density starts with a rough stage.

    A rough stage that does not converge hands on nothing: the fine one starts from the density given.
    """

    __name_mixin__ = "Staged"
    _keys = frozenset({"coarse_grid_level"})
    coarse_grid_level: int | None

    def scf(self: Any, dm0: Any = None, **options: Any) -> Any:
        """As the library's, with the rough stage ahead unless a single iteration is asked for."""
        if self.max_cycle > 1:
            rough = self.copy()
            if self.coarse_grid_level is not None:
                rough.grids = turned_grids(self.mol, self.coarse_grid_level, single_precision=True)
            rough.conv_tol, rough.conv_tol_grad, rough.conv_check = ROUGH_ENERGY_Eh, ROUGH_GRADIENT, False
            rough.max_cycle = min(self.max_cycle, ROUGH_CYCLES)
            fitting = getattr(self, "with_df", None)
            with nullcontext() if fitting is None else fitting.rough():
                super(Staged, rough).scf(dm0, **options)  # type: ignore[misc]
            if rough.converged and np.isfinite(rough.e_tot):
                dm0 = rough.make_rdm1()
        super().scf(dm0, **options)  # type: ignore[misc]
        if self.converged and hasattr(self, "with_df"):
            self.make_whole()
        return self.e_tot

    def make_whole(self: Any) -> None:
        """Energy and canonical orbitals of the present density from a whole Fock matrix.

        The last one of an SCF was made up from an earlier one, see `exchange.Anchor`.
        """
        self.with_df.forget()
        density = self.make_rdm1()
        potential = self.get_veff(self.mol, density)
        core = self.get_hcore()
        self.e_tot = self.energy_tot(density, core, potential)
        fock = self.get_fock(core, self.get_ovlp(), potential, density)
        self.mo_energy, self.mo_coeff = self.canonicalize(self.mo_coeff, self.mo_occ, fock)


def staged(field: Any, coarse_grid_level: int | None) -> Any:
    """The same object, with a rough stage, on a coarser grid if one is given."""
    lib.set_class(field, (Staged, field.__class__))
    field.coarse_grid_level = coarse_grid_level
    return field
