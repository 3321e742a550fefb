"""Second derivatives of the energy with respect to real orbital rotations, applied to trial vectors."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

from .frame import turned_grids

Array = NDArray[np.float64]

RESPONSE_GRID = 0
"""Grid of the exchange-correlation kernel: the sign of a curvature needs no fine grid."""


@dataclass(frozen=True)
class Curvature:
    """Gradient, diagonal and product of the orbital Hessian of a mean field, in Eh.

    A rotation is exp(K), K antisymmetric in the orbital basis. Unrestricted: x holds the virtual-occupied
    blocks of K for alpha, then for beta. Restricted-open: the blocks between virtual, singly and doubly
    occupied orbitals.
    The energy after a small rotation is E + 2 g.x + x.Hx.
    """

    gradient: Array
    diagonal: Array
    product: Callable[[Array], Array]
    """Vectors in, vectors out; shape (vectors, parameters)."""
    rotated: Callable[[Array], Array]
    """Orbitals after the rotation x, shaped like the field's own."""


def curvature(field: Any, response_grid: int | None = RESPONSE_GRID) -> Curvature:
    """The orbital Hessian of a field at its orbitals. `response_grid` None takes the field's own grid.

    With D the occupation matrix and F the Fock matrix of a spin, the energy changes by tr F[K,D] +
    tr F[K,[K,D]]/2 plus the response to [K,D]. Differs from PySCF's in taking several vectors at once, in
    keeping, for restricted-open methods, the terms through the closed-virtual block of a spin's Fock matrix
    (only their sum is zero), and in summing the spins in a continuum's response for these methods too.
    """
    from pyscf import scf

    restricted = isinstance(field, scf.rohf.ROHF)
    orbitals, occupations = np.asarray(field.mo_coeff), np.asarray(field.mo_occ)
    if restricted:
        orbitals = np.stack([orbitals, orbitals])
        occupations = np.stack([occupations > 0, occupations > 1])
    occupied = (occupations > 0).astype(float)
    density = np.stack([np.diag(n) for n in occupied])
    fock = orbitals.transpose(0, 2, 1) @ _fock(field, restricted) @ orbitals
    masks = (occupied[:, :, None] == 0) & (occupied[:, None, :] == 1)
    union = masks.any(axis=0)
    cut = int(masks[0].sum())
    respond = _response(field, orbitals, occupied, response_grid)

    def spread(vectors: Array) -> Array:
        """K of each spin, shape (vectors, 2, orbitals, orbitals)."""
        full = np.zeros((len(vectors), *fock.shape))
        if restricted:
            full[:, :, union] = vectors[:, None, :]
        else:
            full[:, 0, masks[0]], full[:, 1, masks[1]] = vectors[:, :cut], vectors[:, cut:]
        return full - full.transpose(0, 1, 3, 2)

    def gather(full: Array) -> Array:
        """Parameters of matrices of both spins; restricted-open methods sum the spins."""
        if restricted:
            return np.asarray(full.sum(axis=1)[:, union])
        return np.hstack([full[:, 0, masks[0]], full[:, 1, masks[1]]])

    def product(vectors: Array) -> Array:
        rotation = spread(vectors)
        change = _bracket(rotation, density)
        in_basis = orbitals @ change @ orbitals.transpose(0, 2, 1)
        answer = respond(in_basis.transpose(1, 0, 2, 3)).transpose(1, 0, 2, 3)
        answer = orbitals.transpose(0, 2, 1) @ answer @ orbitals
        through_fock = 0.5 * (_bracket(fock, change) + _bracket(_bracket(fock, rotation), density))
        return gather(through_fock + _bracket(answer, density))

    def rotated(vector: Array) -> Array:
        rotation = spread(vector[None])[0]
        turned = np.stack([c @ scipy.linalg.expm(k) for c, k in zip(orbitals, rotation, strict=True)])
        return turned[0] if restricted else turned

    steps = np.diagonal(fock, axis1=1, axis2=2)
    gaps = (steps[:, :, None] - steps[:, None, :]) * (occupied[:, None, :] - occupied[:, :, None])
    return Curvature(gather(_bracket(fock, density)[None])[0], gather(gaps[None])[0], product, rotated)


def _bracket(left: Array, right: Array) -> Array:
    return np.asarray(left @ right - right @ left)


def _fock(field: Any, restricted: bool) -> Array:
    """Fock matrices of alpha and beta in the basis, shape (2, basis functions, basis functions)."""
    fock = field.get_fock(dm=field.make_rdm1())
    return np.stack([fock.focka, fock.fockb]) if restricted else np.asarray(fock)


def _response(
    field: Any, orbitals: Array, occupied: Array, response_grid: int | None
) -> Callable[[Array], Array]:
    """Both spins' Fock matrices respond to density changes of shape (2, vectors, functions, functions)."""
    from .fitting import responding

    continuum = getattr(field, "with_solvent", None)
    bare = field if continuum is None else field.undo_solvent()
    if hasattr(bare, "xc") and response_grid is not None and response_grid < bare.grids.level:
        bare = bare.copy()
        bare.grids = turned_grids(bare.mol, response_grid, single_precision=True)
    if hasattr(bare, "xc") and bare.grids.coords is None:
        bare.grids.build(with_non0tab=True)
    inner = bare.gen_response(orbitals, occupied, hermi=1, with_nlc=False)

    def respond(change: Array) -> Array:
        with responding(bare):
            answer = inner(np.ascontiguousarray(change))
        if continuum is not None:
            answer = answer + continuum._B_dot_x(np.ascontiguousarray(change[0] + change[1]))
        return np.asarray(answer)

    return respond
