"""Three-index integrals L_P,mn of the pairs of functions that overlap, in the Coulomb metric.

A tight function near a nucleus overlaps with few others: of all pairs of 455 functions half are worth keeping. They are
kept twice: packed and in double precision, and in single precision as one rectangle of partners for every function,
ready for matrix products.
"""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.linalg
from numpy.typing import NDArray
from pyscf import df, gto

Array = NDArray[np.float64]
Single = NDArray[np.float32]
Index = NDArray[np.intp]

NEGLIGIBLE = 1e-7
"""A pair is dropped where the square root of its self-repulsion, in Eh, is below this (Schwarz's bound)."""
ALIKE = 0.8
"""Functions of one atom share their partners if the one with fewer has at least this share of them."""
CHUNK_MB = 40.0
"""Integrals made at once."""


@dataclass(frozen=True, eq=False)
class Cluster:
    """Functions of one atom with common partners."""

    functions: Index
    partners: Index
    columns: Index
    """Where each pair stands among the packed integrals, (functions, partners); -1 if it was dropped."""
    single: Single
    """Integrals in single precision, (functions, fitting functions, partners)."""

    def double(self, packed: Array, function: int) -> Array:
        """Integrals of one function in double precision, (rows of `packed`, partners)."""
        columns = self.columns[function]
        taken = np.take(packed, columns, axis=1, mode="clip")  # quicker than an index in brackets
        taken[:, columns < 0] = 0
        return np.asarray(taken)


@dataclass(frozen=True, eq=False)
class ThreeIndex:
    """The integrals of one molecule."""

    size: int
    packed: Array
    """(fitting functions, pairs)."""
    rows: Index
    columns: Index
    """First and second function of each pair, the first not before the second."""
    clusters: tuple[Cluster, ...]
    overlap: Array

    def pack(self, matrix: Array) -> Array:
        """Elements of a symmetric matrix that belong to the pairs; off the diagonal both count."""
        return np.asarray(np.where(self.rows == self.columns, 1.0, 2.0) * matrix[self.rows, self.columns])

    def unpack(self, values: Array) -> Array:
        """Symmetric matrix of one value for each pair."""
        matrix = np.zeros((self.size, self.size))
        matrix[self.rows, self.columns] = matrix[self.columns, self.rows] = values
        return matrix


def three_index(mol: Any, auxmol: Any) -> ThreeIndex:
    """Compute the integrals."""
    kept = overlapping(mol)
    rows, columns = np.nonzero(np.tril(kept))
    packed = _packed(mol, auxmol, rows, columns)
    place = np.full(kept.shape, -1)
    place[rows, columns] = place[columns, rows] = np.arange(len(rows))
    clusters = tuple(
        Cluster(functions, partners, where, _single(packed, where))
        for functions, partners in _clusters(mol, kept)
        for where in [place[np.ix_(functions, partners)]]
    )
    return ThreeIndex(mol.nao, packed, rows, columns, clusters, mol.intor_symmetric("int1e_ovlp"))


def key_of(mol: Any, auxbasis: Any) -> str:
    """Everything that decides the integrals."""
    text = repr((mol._atm.tolist(), mol._bas.tolist(), mol._env.tolist(), sorted(auxbasis.items())))
    return hashlib.sha256(text.encode()).hexdigest()


def overlapping(mol: Any) -> NDArray[np.bool_]:
    """Which pairs of functions are kept, shape (n, n)."""
    kept = pair_bounds(mol) > NEGLIGIBLE
    np.fill_diagonal(kept, True)
    return np.asarray(kept)


def pair_bounds(mol: Any) -> Array:
    """sqrt((mn|mn)) in Eh^(1/2), largest over the directions of each pair of contracted functions, shape (n, n)."""
    from pyscf.scf import _vhf

    split = mol.copy(deep=False)
    split._bas, start_of = _split_contractions(mol)
    bounds = _vhf._VHFOpt(split, "int2e", qcondname="CVHFnr_int2e_q_cond").q_cond
    return np.asarray(bounds[np.ix_(start_of, start_of)])


def _split_contractions(mol: Any) -> tuple[NDArray[np.int32], Index]:
    """One shell for each contraction of the molecule's shells, and the new shell of every function."""
    shells: list[Any] = []
    of_function: list[int] = []
    for shell in mol._bas:
        for k in range(shell[gto.NCTR_OF]):
            one = shell.copy()
            one[gto.NCTR_OF] = 1
            one[gto.PTR_COEFF] = shell[gto.PTR_COEFF] + k * shell[gto.NPRIM_OF]
            of_function += [len(shells)] * (2 * int(shell[gto.ANG_OF]) + 1)
            shells.append(one)
    return np.array(shells, dtype=np.int32), np.array(of_function)


def _packed(mol: Any, auxmol: Any, rows: Index, columns: Index) -> Array:
    metric = auxmol.intor("int2c2e", hermi=1)
    try:
        low = scipy.linalg.cholesky(metric, lower=True)
    except scipy.linalg.LinAlgError:  # not positive, as for a part of the Coulomb operator
        values, vectors = scipy.linalg.eigh(metric)
        kept = values > df.incore.LINEAR_DEP_THR
        low = None
        inverse = (vectors[:, kept] / np.sqrt(values[kept])).T
    name = mol._add_suffix("int3c2e")
    environment = gto.mole.conc_env(mol._atm, mol._bas, mol._env, auxmol._atm, auxmol._bas, auxmol._env)
    start = gto.moleintor.make_loc(environment[1], name)
    optimizer = gto.moleintor.make_cintopt(*environment, name)
    packed = np.empty((len(metric) if low is not None else len(inverse), len(rows)))
    most = max(1, int(CHUNK_MB * 1e6 / (8 * len(metric))))
    first = 0
    while first < mol.nbas:
        last = first + 1
        while last < mol.nbas and _pairs_before(start[last + 1]) - _pairs_before(start[first]) <= most:
            last += 1
        part = (first, last, 0, mol.nbas, mol.nbas, mol.nbas + auxmol.nbas)
        made = gto.moleintor.getints3c(name, *environment, part, 1, "s2ij", start, optimizer)
        mine = slice(*np.searchsorted(rows, (start[first], start[last])))
        place = _pairs_before(rows[mine]) + columns[mine] - _pairs_before(start[first])
        wanted = made.reshape(-1, len(metric))[place].T
        if low is not None:
            solved = scipy.linalg.solve_triangular(
                low, wanted, lower=True, overwrite_b=True, check_finite=False
            )
        else:
            solved = inverse @ wanted
        packed[:, mine] = solved
        first = last
    return packed


def _pairs_before(function: Any) -> Any:
    """Pairs whose first function stands before this one."""
    return function * (function + 1) // 2


def _single(packed: Array, columns: Index) -> Single:
    found = np.empty((len(columns), len(packed), columns.shape[1]), dtype=np.float32)
    for place, mine in zip(found, columns, strict=True):
        place[...] = np.take(packed, mine, axis=1, mode="clip")
        place[:, mine < 0] = 0
    return found


def _clusters(mol: Any, kept: NDArray[np.bool_]) -> list[tuple[Index, Index]]:
    """Functions of one atom with about the same partners, and all their partners."""
    count = kept.sum(axis=1)
    found = []
    for _, _, start, stop in mol.aoslice_by_atom():
        order = start + np.argsort(-count[start:stop], kind="stable")
        while len(order):
            mine = order[count[order] >= ALIKE * count[order[0]]]
            found.append((mine, np.flatnonzero(kept[mine].any(axis=0))))
            order = order[len(mine) :]
    return found
