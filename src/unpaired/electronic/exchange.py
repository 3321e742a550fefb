"""Exchange matrices from three-index integrals, in full or as a small change of one made before.

With half-transformed integrals H_P = L_P C and D = C n C^T: K = sum_P H_P n H_P^T. `Anchor` keeps one such matrix,
made in double precision; that of a density nearby differs by a small term, for which single precision does. Of
this term only the product with the occupied orbitals is made, which is cheaper and is all that the energy and its
gradient ask for (S. Manzer, P. R. Horn, N. Mardirossian, M. Head-Gordon, J. Chem. Phys. 143, 024113 (2015));
the block between virtual orbitals stays that of the anchor. Left out altogether, as in that paper, it would act
like a level shift.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .threads import side_by_side
from .threeindex import Single, ThreeIndex

Array = NDArray[np.float64]
Factors = Sequence[tuple[Array, Array]]
"""Orbitals (functions, columns) and occupations of each matrix."""

BATCH_MB = 16.0
"""Half-transformed integrals worked on at once, by each thread."""
NEAR = 0.3
"""Largest distance, sqrt(sum_i |dC_i|^2), of orbitals from those of the anchor."""


def coulomb(integrals: ThreeIndex, matrices: Array) -> Array:
    """sum_P L_P (L_P . D) of each symmetric matrix."""
    packed = [integrals.pack(matrix) for matrix in matrices]

    def part(rows: slice) -> list[Array]:
        mine = integrals.packed[rows]
        return [(mine @ one) @ mine for one in packed]

    batches = _batches(integrals, integrals.packed.shape[1] * 8)
    sums = [np.sum(parts, axis=0) for parts in zip(*side_by_side(part, batches), strict=True)]
    return np.stack([integrals.unpack(one) for one in sums])


def whole(integrals: ThreeIndex, factors: Factors, kind: Any = np.float64) -> Array:
    """Exchange matrices in full; `kind` is the precision of the products."""
    parts = _in_batches(integrals, factors, kind, lambda rows, halves: _outer(halves, factors))
    return np.asarray(np.sum(parts, axis=0))


def _outer(halves: Sequence[NDArray[Any]], factors: Factors) -> Array:
    """sum_P H_P n H_P^T of a batch."""
    matrices = []
    for half, (_, n) in zip(halves, factors, strict=True):
        flat = _flat(half)
        scaled = flat if np.all(n == 1) else (half * n[:, None].astype(half.dtype)).reshape(flat.shape)
        matrices.append(scaled @ flat.T)
    return np.array(matrices, dtype=np.float64)


def complete(acted: Array, orbitals: Array, overlap: Array) -> Array:
    """The symmetric matrix K with K C = `acted` for orthonormal C, zero between orbitals orthogonal to these."""
    dual = overlap @ orbitals
    inner = orbitals.T @ acted
    side = (acted - 0.25 * dual @ (inner + inner.T)) @ dual.T
    return np.asarray(side + side.T)


@dataclass(frozen=True, eq=False)
class Anchor:
    """Exchange matrices of one set of occupied orbitals, and what the next ones are made from."""

    orbitals: tuple[Array, ...]
    matrices: Array
    halves: list[list[Single]]
    """Half-transformed integrals of every batch and spin, shape (functions, occupied, rows of the batch)."""

    def distances(self, integrals: ThreeIndex, orbitals: Sequence[Array]) -> list[Array] | None:
        """Orbitals, turned among themselves to be nearest to the anchor's, minus those; None if far away."""
        found = []
        for mine, other in zip(self.orbitals, orbitals, strict=True):
            if mine.shape != other.shape:
                return None
            left, shared, right = np.linalg.svd(other.T @ integrals.overlap @ mine)
            if 2 * np.sum(1 - np.minimum(shared, 1)) > NEAR**2:
                return None
            found.append(other @ (left @ right) - mine)
        return found

    def near(self, integrals: ThreeIndex, steps: Sequence[Array]) -> Array:
        """Exchange matrices of the orbitals at these distances."""
        factors = [(step, np.ones(step.shape[1])) for step in steps]
        orbitals = [c + step for c, step in zip(self.orbitals, steps, strict=True)]
        single = [c.astype(np.float32) for c in orbitals]
        batches = _rows(integrals, factors, np.float32)

        def act(rows: slice, halves: Sequence[NDArray[Any]]) -> list[Array]:
            answer = []
            for change, old, c in zip(halves, self.halves[batches.index(rows)], single, strict=True):
                changed = _flat(change)
                middle = _flat(old) + changed / 2
                # with dK = sum_P h m^T + m h^T: dK C = h (m^T C) + m (h^T C)
                total = changed @ (c.T @ middle).T + middle @ (c.T @ changed).T
                answer.append(total.astype(np.float64))
            return answer

        parts = _in_batches(integrals, factors, np.float32, act)
        acted = [np.sum(one, axis=0) for one in zip(*parts, strict=True)]
        change = [complete(kc, c, integrals.overlap) for kc, c in zip(acted, orbitals, strict=True)]
        return self.matrices + np.stack(change)


def anchor(integrals: ThreeIndex, orbitals: Sequence[Array]) -> Anchor:
    """Exchange matrices of orthonormal occupied orbitals in full and in double precision."""
    factors = [(c, np.ones(c.shape[1])) for c in orbitals]
    batches = _rows(integrals, factors, np.float32)
    halves: list[list[Single]] = [[] for _ in batches]

    def act(rows: slice, found: Sequence[NDArray[Any]]) -> Array:
        halves[batches.index(rows)] = [half.astype(np.float32) for half in found]
        return _outer(found, factors)

    matrices = np.sum(_in_batches(integrals, factors, np.float64, act, batches), axis=0)
    return Anchor(tuple(orbitals), matrices, halves)


def _in_batches(
    integrals: ThreeIndex,
    factors: Factors,
    kind: Any,
    work: Callable[[slice, Sequence[NDArray[Any]]], Any],
    batches: list[slice] | None = None,
) -> list[Any]:
    """`work` of the half-transformed integrals (functions, columns, rows of the batch) of every batch."""
    columns = np.hstack([c for c, _ in factors]).astype(kind)
    edges = np.cumsum([0, *(n.size for _, n in factors)])
    across = [np.ascontiguousarray(columns[cluster.partners].T) for cluster in integrals.clusters]

    def run(rows: slice) -> Any:
        half = np.empty((integrals.size, columns.shape[1], rows.stop - rows.start), dtype=kind)
        packed = integrals.packed[rows]
        for cluster, mine in zip(integrals.clusters, across, strict=True):
            for k, function in enumerate(cluster.functions):
                part = cluster.single[k, rows] if kind == np.float32 else cluster.double(packed, k)
                np.matmul(mine, part.T, out=half[function])
        return work(rows, [half[:, a:b] for a, b in itertools.pairwise(edges)])

    return side_by_side(run, batches or _rows(integrals, factors, kind))


def _flat(half: NDArray[Any]) -> NDArray[Any]:
    """Functions by everything else, also where there is nothing else."""
    return half.reshape(len(half), half.shape[1] * half.shape[2])


def _rows(integrals: ThreeIndex, factors: Factors, kind: Any) -> list[slice]:
    return _batches(integrals, integrals.size * sum(n.size for _, n in factors) * np.dtype(kind).itemsize)


def _batches(integrals: ThreeIndex, row_bytes: int) -> list[slice]:
    """Rows of the integrals in equal parts of about BATCH_MB."""
    total = len(integrals.packed)
    count = max(1, min(total, -(-total * max(row_bytes, 1) // int(BATCH_MB * 1e6))))
    edges = [total * k // count for k in range(count + 1)]
    return [slice(a, b) for a, b in itertools.pairwise(edges)]
