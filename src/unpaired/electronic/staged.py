"""Kohn-Sham fields that converge on a coarse grid first: most iterations need no fine one."""

from __future__ import annotations

from typing import Any

import numpy as np
from pyscf import lib

from .frame import turned_grids

ROUGH_ENERGY_Eh = 1e-4
ROUGH_GRADIENT = 3e-3
"""Where the coarse grid has done its part: about the gradient that the change of grids brings in."""
ROUGH_CYCLES = 40


class Staged:
    """Mixin for a Kohn-Sham object: its SCF from a density starts with the coarse grid.

    A coarse stage that does not converge hands on nothing: the fine one starts from the density given.
    """

    __name_mixin__ = "Staged"
    _keys = frozenset({"coarse_grid_level"})
    coarse_grid_level: int

    def scf(self: Any, dm0: Any = None, **options: Any) -> Any:
        """As the library's, with the coarse stage ahead unless a single iteration is asked for."""
        if self.max_cycle > 1:
            rough = self.copy()
            rough.grids = turned_grids(self.mol, self.coarse_grid_level)
            rough.conv_tol, rough.conv_tol_grad, rough.conv_check = ROUGH_ENERGY_Eh, ROUGH_GRADIENT, False
            rough.max_cycle = min(self.max_cycle, ROUGH_CYCLES)
            super(Staged, rough).scf(dm0, **options)  # type: ignore[misc]
            if rough.converged and np.isfinite(rough.e_tot):
                dm0 = rough.make_rdm1()
        return super().scf(dm0, **options)  # type: ignore[misc]


def staged(field: Any, coarse_grid_level: int) -> Any:
    """The same object, with a coarse stage."""
    lib.set_class(field, (Staged, field.__class__))
    field.coarse_grid_level = coarse_grid_level
    return field
