"""One-electron integrals that the analysis of a finished state needs; nothing here runs a calculation."""

from __future__ import annotations

from collections.abc import Iterator
from functools import lru_cache
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from ..level import Level
from ..minimal import BeyondMinimalBasis, MinimalBasis
from ..molecule import ATOMIC_NUMBER, SYMBOLS, Molecule
from ..point import Point
from .mole import build_mole

Array = NDArray[np.float64]

BLOCK_BYTES = 64_000_000
"""Basis functions on points are evaluated in blocks of about this size."""
KEPT_BYTES = 200_000_000
"""Dipolar operators up to this size are kept for the next level of the same molecule."""


UPPER = tuple((i, j) for i in range(3) for j in range(i, 3))
"""Elements of a symmetric tensor, in the order of `_operators`."""


def field_gradients(point: Point, spin_density_matrix: Array) -> Array:
    """Dipolar integral of the spin density at every nucleus, bohr^-3, shape (atoms, 3, 3), traceless.

    F_ij(R) = sum_mn P_mn <m|(3 r_i r_j - delta_ij r^2)/r^5|n>, r from R. The operator is the second
    derivative of 1/r without its contact term; by parts that is
    2 sum_mn P_mn (<d_i d_j m|1/r|n> + <d_i m|1/r|d_j n>), of which the contact term is exactly the trace.
    """
    molecule = point.molecule
    atoms, functions = len(molecule.elements), len(spin_density_matrix)
    where = _where(point)
    small = atoms * len(UPPER) * functions * (functions + 1) // 2 * 8 <= KEPT_BYTES
    operators = _kept_operators(where) if small else _operators(where)
    lower = spin_density_matrix[np.tril_indices(functions)] * 2.0
    lower[np.cumsum(np.arange(1, functions + 1)) - 1] /= 2.0  # the diagonal counts once
    found = np.empty((atoms, 3, 3))
    for atom, packed in enumerate(operators):
        for (i, j), value in zip(UPPER, packed @ lower, strict=True):
            found[atom, i, j] = found[atom, j, i] = value
    trace = np.trace(found, axis1=1, axis2=2)
    return np.asarray(found - trace[:, None, None] / 3 * np.eye(3))


def minimal_basis(point: Point) -> MinimalBasis:
    """The free-atom functions (PySCF's MINAO set) that orbitals are compared with.

    Raises BeyondMinimalBasis for an element that the set does not have (potassium, and those after krypton).
    """
    lacking = {"K"} | set(SYMBOLS[36:])
    for element in point.molecule.elements:
        if element in lacking:
            raise BeyondMinimalBasis(f"there are no free-atom functions for {element}")
    return _free_atom_functions(_where(point))


class _Where(NamedTuple):
    """Nuclei and basis set: what the integrals depend on."""

    elements: tuple[str, ...]
    coordinates_bohr: bytes
    basis: str

    def mole(self) -> Any:
        coordinates = np.frombuffer(self.coordinates_bohr).reshape(-1, 3)
        multiplicity = 1 + sum(ATOMIC_NUMBER[e] for e in self.elements) % 2  # any that is possible will do
        return build_mole(
            Point(Molecule(self.elements, coordinates, 0, multiplicity), Level("UHF", self.basis))
        )


def _where(point: Point) -> _Where:
    molecule = point.molecule
    return _Where(molecule.elements, molecule.coordinates_bohr.tobytes(), point.level.basis)


def _operators(where: _Where) -> Iterator[Array]:
    """For nucleus after nucleus the operators of `UPPER`, shape (6, pairs of functions), lower triangles."""
    mole = where.mole()
    rows, columns = np.tril_indices(mole.nao)
    for atom in range(mole.natm):
        with mole.with_rinv_at_nucleus(atom):
            second = mole.intor("int1e_ipiprinv", comp=9) + mole.intor("int1e_iprinvip", comp=9)
        second = second.reshape(3, 3, mole.nao, mole.nao)
        # Exchanging the two functions exchanges the two axes.
        both = [second[i, j] + second[j, i] for i, j in UPPER]
        yield np.stack([(one[rows, columns] + one[columns, rows]) / 2 for one in both])


@lru_cache(maxsize=1)
def _kept_operators(where: _Where) -> tuple[Array, ...]:
    """`_operators` of the molecule at hand: every level of a recipe asks for the same."""
    return tuple(_operators(where))


@lru_cache(maxsize=1)
def _free_atom_functions(where: _Where) -> MinimalBasis:
    from pyscf import gto

    mole = where.mole()
    reference = gto.Mole()
    reference.unit = "Bohr"
    reference.atom = [(e, mole.atom_coord(k)) for k, e in enumerate(where.elements)]
    reference.basis = {e: gto.basis.load("minao", e) for e in set(where.elements)}
    reference.spin, reference.verbose = None, 0
    reference.build(dump_input=False, parse_arg=False)
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
