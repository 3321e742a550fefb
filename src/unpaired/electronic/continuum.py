"""A continuum around the molecule, with everything that does not change between iterations computed once.

The library computes the potential of every pair of functions at every point of the surface twice in every iteration,
and factorises the equations of the charges twice. Here both are kept. The model is the library's IEF-PCM:
E. Cances, B. Mennucci, J. Tomasi, J. Chem. Phys. 107, 3032 (1997), charges symmetrised.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import df, gto, lib
from pyscf.dft import gen_grid
from pyscf.solvent import pcm
from pyscf.solvent.grad.pcm import grad_nuc, grad_solver
from scipy import linalg

Array = NDArray[np.float64]

KEPT_MB = 1500.0
"""Potentials up to this size are kept; larger ones are computed anew each time, as the library does."""
BLOCK_MB = 64.0
"""Potentials are made and used in blocks of this size."""


class Continuum(pcm.PCM):  # type: ignore[misc]
    """IEF-PCM of a dielectric constant."""

    def __init__(self, mole: Any, dielectric: float) -> None:
        super().__init__(mole)
        self.method = "IEF-PCM"
        self.eps = dielectric
        self._factors: Any = None
        self._potentials: NDArray[np.float32] | None = None

    def build(self, ng: int | None = None) -> None:
        """Surface, equations and potentials."""
        super().build(ng)
        self._factors = linalg.lu_factor(self._intermediates["K"])
        self._potentials = self._kept_potentials()

    def surface_points(self) -> int:
        """How many points the surface has, without its equations."""
        radii = self.vdw_scale * pcm.modified_Bondi + self.r_probe / pcm.radii.BOHR
        per_sphere = gen_grid.LEBEDEV_ORDER[self.lebedev_order]
        return len(pcm.gen_surface(self.mol, rad=radii, ng=per_sphere)["charge_exp"])

    def reset(self, mol: Any = None) -> Continuum:
        """Forget the surface, for another geometry."""
        self._factors = self._potentials = None
        super().reset(mol)
        return self

    def grad(self, dm: Array) -> Array:
        """Gradient (atoms, 3) of the energy of the charges for the total density matrix."""
        self._get_vind(dm)  # the charges of this density, whatever was asked for last
        return np.asarray(self._attraction(dm) + grad_nuc(self, dm) + grad_solver(self, dm))

    def _attraction(self, dm: Array) -> Array:
        """Gradient of the attraction between density and charges.

        One kind of derivative integrals is enough where the library makes two: moving a charge is moving all
        functions the other way.
        """
        charges, functions = self._intermediates["q_sym"], self.mol.nao
        moved = np.zeros((3, functions))
        dragged = np.zeros((3, len(charges)))
        for points in _blocks(len(charges), max(1, int(BLOCK_MB * 1e6 / 24 / functions**2))):
            surface = gto.fakemol_for_charges(
                self.surface["grid_coords"][points], expnt=self.surface["charge_exp"][points] ** 2
            )
            derivative = df.incore.aux_e2(self.mol, surface, intor="int3c2e_ip1", aosym="s1")
            felt = np.einsum("xijg,ij->xig", derivative, dm)
            moved += felt @ charges[points]
            dragged[:, points] = -2 * felt.sum(axis=1) * charges[points]
        by_atom = [moved[:, first:last].sum(axis=1) for first, last in self.mol.aoslice_by_atom()[:, 2:]]
        by_charge = [dragged[:, first:last].sum(axis=1) for first, last in self.surface["gslice_by_atom"]]
        return np.asarray(2 * np.array(by_atom) + np.array(by_charge))

    def _kept_potentials(self) -> NDArray[np.float32] | None:
        """Potential of every pair of functions, shape (points, pairs), or None if there are too many.

        Single precision halves the memory. What is rounded is the potential of a pair, the same for both of
        its uses, so the energy stays variational; it changes by less than 1e-7 Eh.
        """
        points, pairs = len(self.surface["charge_exp"]), self.mol.nao * (self.mol.nao + 1) // 2
        if points * pairs * 4 / 1e6 > KEPT_MB:
            return None
        kept = np.empty((points, pairs), dtype=np.float32)
        block = max(1, int(BLOCK_MB * 1e6 / 8 / pairs))
        for rows in _blocks(points, block):
            charges = gto.fakemol_for_charges(
                self.surface["grid_coords"][rows], expnt=self.surface["charge_exp"][rows] ** 2
            )
            kept[rows] = df.incore.aux_e2(self.mol, charges, intor="int3c2e", aosym="s2ij").T
        return kept

    def _charges(self, potentials: Array) -> tuple[Array, Array]:
        """Charges and symmetrised charges for potentials of shape (sets, points)."""
        R = self._intermediates["R"]
        charges = linalg.lu_solve(self._factors, R @ potentials.T).T
        transposed = (R.T @ linalg.lu_solve(self._factors, potentials.T, trans=1)).T
        return charges, (charges + transposed) / 2

    def _get_vind(self, dms: Any) -> tuple[float, Array]:
        if not self._intermediates:
            self.build()
        functions = dms.shape[-1]
        density = np.asarray(dms).reshape(-1, functions, functions)
        if len(density) == 2:
            density = density.sum(axis=0, keepdims=True)
        potentials = self.v_grids_n - self._get_v(density)
        charges, symmetric = self._charges(potentials)
        self._intermediates |= {  # what the library's gradients read
            "q": charges[0],
            "q_sym": symmetric[0],
            "v_grids": potentials[0],
            "dm": density,
        }
        return 0.5 * float(symmetric[0] @ potentials[0]), self._get_vmat(symmetric)[0]

    def _B_dot_x(self, dms: Array) -> Array:
        if not self._intermediates:
            self.build()
        densities = dms.reshape(-1, *dms.shape[-2:])
        return self._get_vmat(self._charges(-self._get_v(densities))[1]).reshape(dms.shape)

    def _get_v(self, dms: Array) -> Array:
        if self._potentials is None:
            return np.asarray(super()._get_v(dms))
        packed = lib.pack_tril(dms + dms.swapaxes(1, 2))
        diagonal = np.arange(dms.shape[-1])
        packed[:, diagonal * (diagonal + 1) // 2 + diagonal] /= 2
        parts = [packed @ part.T for _, part in self._parts(self._potentials)]
        return np.hstack(parts)

    def _get_vmat(self, q: Array) -> Array:
        if self._potentials is None:
            return np.asarray(super()._get_vmat(q))
        charges = np.asarray(q).reshape(-1, len(self._potentials))
        packed = sum(charges[:, rows] @ part for rows, part in self._parts(self._potentials))
        return np.asarray(-lib.unpack_tril(packed))

    @staticmethod
    def _parts(potentials: NDArray[np.float32]) -> Iterator[tuple[slice, Array]]:
        """The potentials block by block in double precision, in which all sums are made."""
        block = max(1, int(BLOCK_MB * 1e6 / 8 / potentials.shape[1]))
        for rows in _blocks(len(potentials), block):
            yield rows, potentials[rows].astype(np.float64)


def _blocks(points: int, block: int) -> Iterator[slice]:
    for start in range(0, points, block):
        yield slice(start, start + block)
