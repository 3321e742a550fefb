"""One-electron integrals that the analysis of a finished state needs; nothing here runs a calculation."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from ..minimal import BeyondMinimalBasis, MinimalBasis
from ..molecule import SYMBOLS
from ..point import Point
from .mole import build_mole

Array = NDArray[np.float64]

BLOCK_BYTES = 64_000_000
"""Basis functions on points are evaluated in blocks of about this size."""


def field_gradients(point: Point, spin_density_matrix: Array) -> Array:
    """Dipolar integral of the spin density at every nucleus, bohr^-3, shape (atoms, 3, 3), traceless.

    F_ij(R) = sum_mn P_mn <m|(3 r_i r_j - delta_ij r^2)/r^5|n>, r from R. The operator is the second
    derivative of 1/r without its contact term; by parts that is
    2 sum_mn P_mn (<d_i d_j m|1/r|n> + <d_i m|1/r|d_j n>), of which the contact term is exactly the trace.
    """
    mole = build_mole(point)
    flat = spin_density_matrix.ravel()
    found = np.empty((mole.natm, 3, 3))
    for atom in range(mole.natm):
        with mole.with_rinv_at_nucleus(atom):
            twice = mole.intor("int1e_ipiprinv", comp=9).reshape(9, -1) @ flat
            # Half of the pairs suffice: exchanging m and n exchanges i and j, which is symmetrised below.
            once = mole.intor("int1e_iprinvip", comp=9, hermi=1).reshape(9, -1) @ flat
        found[atom] = 2 * (twice + once).reshape(3, 3)
    found = (found + found.transpose(0, 2, 1)) / 2
    trace = np.trace(found, axis1=1, axis2=2)
    return np.asarray(found - trace[:, None, None] / 3 * np.eye(3))


def minimal_basis(point: Point) -> MinimalBasis:
    """The free-atom functions (PySCF's MINAO set) that orbitals are compared with.

    Raises BeyondMinimalBasis for an element that the set does not have (potassium, and those after krypton).
    """
    from pyscf import gto
    from pyscf.lo.iao import reference_mol

    lacking = {"K"} | set(SYMBOLS[36:])
    for element in point.molecule.elements:
        if element in lacking:
            raise BeyondMinimalBasis(f"there are no free-atom functions for {element}")
    mole = build_mole(point)
    reference = reference_mol(mole, "minao")
    labels = reference.ao_labels(fmt=False)
    charges = [gto.charge(symbol) for _, symbol, _, _ in labels]
    axes = {"px": (1.0, 0.0, 0.0), "py": (0.0, 1.0, 0.0), "pz": (0.0, 0.0, 1.0)}
    return MinimalBasis(
        cross=gto.intor_cross("int1e_ovlp", mole, reference),
        own=reference.intor_symmetric("int1e_ovlp"),
        atom=np.array([label[0] for label in labels]),
        core=np.array([_is_core(charge, label[2]) for charge, label in zip(charges, labels, strict=True)]),
        axis=np.array([axes.get(label[2][-1] + label[3], (0.0, 0.0, 0.0)) for label in labels]),
    )


def _is_core(charge: int, shell: str) -> bool:
    """Whether a shell such as 2p of a free atom lies below its valence shells."""
    noble = (2, 10, 18, 36, 54, 86)
    period = 1 + sum(charge > closed for closed in noble)
    number, kind = int(shell[0]), shell[1]
    if kind in "sp":
        return number < period
    if kind == "d":
        filled = charge - (0, *noble)[period - 1] > 12
        return number < period - 1 or (number == period - 1 and filled)
    return number < period - 2


def spin_density_on(point: Point, spin_density_matrix: Array, positions_bohr: Array) -> Array:
    """Spin density at positions of shape (points, 3), bohr^-3, shape (points,)."""
    mole = build_mole(point)
    found = np.empty(len(positions_bohr))
    for rows in _blocks(len(positions_bohr), mole.nao):
        values = mole.eval_gto("GTOval", positions_bohr[rows])
        found[rows] = np.einsum("pm,pm->p", values @ spin_density_matrix, values)
    return found


def _blocks(points: int, functions: int) -> Iterator[slice]:
    size = max(1, BLOCK_BYTES // (16 * functions))
    for start in range(0, points, size):
        yield slice(start, start + size)
