"""Gradients of a converged field: the library's, with the sums over the grid done here.

The nuclei move and the points of the grid stand still (J. A. Pople, P. M. W. Gill, B. G. Johnson, Chem. Phys. Lett.
199, 557 (1992)). With F = D phi and weighted derivatives w of the energy, per spin:

    dE/dR_A = -2 sum_g sum_(m on A) [ grad phi_m (w_rho F_m + sum_y w_y d_y F_m) + sum_y w_y grad d_y phi_m F_m ]

Every function is evaluated once for both spins, and only where it is not negligible.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from .grid import GridIntegration
from .threads import side_by_side

Floats = NDArray[np.float64]

BLOCK_POINTS = 784
"""Points worked on at once."""
NEGLIGIBLE = 1e-9
"""Values below this are left out, in atomic units."""
SECOND = ((4, 5, 6), (5, 7, 8), (6, 8, 9))
"""Where second derivatives xx xy xz yy yz zz stand behind value and gradient."""


def nuclear_gradient(field: Any) -> Floats:
    """dE/dR of a converged mean-field object, shape (atoms, 3), Eh/bohr."""
    from pyscf import lib

    method = field.nuc_grad_method().set(verbose=0)
    if _ours(field):
        method = lib.set_class(method, (GridGradient, method.__class__))
    return np.asarray(method.kernel())


def _ours(field: Any) -> bool:
    """Fitted, with a functional of density and gradient, without range separation or non-local part."""
    numint = getattr(field, "_numint", None)
    if not isinstance(numint, GridIntegration) or getattr(field, "with_df", None) is None:
        return False
    return (
        numint._xc_type(field.xc) in ("LDA", "GGA")
        and numint.rsh_and_hybrid_coeff(field.xc)[0] == 0
        and not field.do_nlc()
    )


class GridGradient:
    """Mixin for a fitted Kohn-Sham gradient object."""

    __name_mixin__ = "Grid"
    grid_part: Floats

    def get_veff(self: Any, mol: Any, dm: Any) -> Any:
        """Coulomb and exchange as derivative matrices; what the grid gives is kept by atoms in `grid_part`."""
        from pyscf import lib

        field = self.base
        share = field._numint.rsh_and_hybrid_coeff(field.xc)[2]
        if share:
            coulomb, exchange = self.get_jk(mol, dm)
            matrices = coulomb[0] + coulomb[1] - share * np.asarray(exchange)
            fitting = coulomb.aux.sum((0, 1)) - share * np.trace(exchange.aux, axis1=0, axis2=1)
        else:
            coulomb = self.get_j(mol, dm)
            matrices = np.stack([coulomb[0] + coulomb[1]] * 2)
            fitting = coulomb.aux.sum((0, 1))
        self.grid_part = grid_gradient(field, np.asarray(dm))
        return lib.tag_array(matrices, aux=fitting)

    def extra_force(self: Any, atom_id: int, envs: Any) -> Any:
        """The library's terms by atom and the grid's."""
        return super().extra_force(atom_id, envs) + self.grid_part[atom_id]  # type: ignore[misc]


def grid_gradient(field: Any, densities: Floats) -> Floats:
    """Exchange-correlation part of the gradient, shape (atoms, 3), of density matrices (2, size, size)."""
    mol, grids, numint = field.mol, field.grids, field._numint
    kind = numint._xc_type(field.xc)
    derivative, components = (2, 4) if kind == "GGA" else (1, 1)
    atom_of = np.repeat(np.arange(mol.natm), np.diff(mol.aoslice_by_atom()[:, 2:]).ravel())

    def of_block(start: int) -> Floats:
        points = slice(start, start + BLOCK_POINTS)
        weights = grids.weights[points]
        values = mol.eval_gto(f"GTOval_sph_deriv{derivative}", grids.coords[points], cutoff=NEGLIGIBLE)
        reach = np.flatnonzero(np.abs(values[0]).max(axis=0) > NEGLIGIBLE)
        values = np.ascontiguousarray(values[:, :, reach].transpose(0, 2, 1))
        functions = len(reach)
        flat = values[:components].transpose(1, 0, 2).reshape(functions, -1)
        images = densities[:, reach[:, None], reach] @ flat
        images = images.reshape(2, functions, components, -1)
        density = np.einsum("mg,smxg->sxg", values[0], images)
        density[:, 1:] *= 2
        given = density[:, 0] if kind == "LDA" else density
        potential = numint.eval_xc_eff(field.xc, given, deriv=1, xctype=kind, spin=1)[1]
        w = potential.reshape(2, components, -1) * weights
        # factor of grad phi, then of each grad d_y phi
        outer = np.einsum("sxg,smxg->mg", w, images)
        force = np.einsum("xmg,mg->mx", values[1:4], outer)
        for y in range(1, components):
            inner = np.einsum("sg,smg->mg", w[:, y], images[:, :, 0])
            force += np.einsum("xmg,mg->mx", values[list(SECOND[y - 1])], inner)
        total = np.zeros((mol.natm, 3))
        np.add.at(total, atom_of[reach], -2 * force)
        return total

    return np.asarray(sum(side_by_side(of_block, list(range(0, len(grids.weights), BLOCK_POINTS)))))
