"""Density matrices as sums over few orbitals."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

RANK = 1e-12
"""Eigenvalues of a density matrix below this are left out."""


def occupied(orbitals: Array, occupations: Array) -> tuple[Array, Array]:
    """Orbitals with electrons, shape (functions, occupied), and their occupations."""
    kept = occupations > 0
    return np.ascontiguousarray(orbitals[:, kept]), np.asarray(occupations[kept], dtype=np.float64)


def factor(dm: Any, matrices: Array) -> list[tuple[Array, Array]]:
    """C and n with D = C n C^T for each of the real symmetric `matrices`, shape (sets, functions, functions).

    `dm` is what the library handed over: if it carries orbitals they are taken, else eigenvectors. A pair of
    restricted-open matrices carries one set of orbitals with occupations 0, 1, 2.
    """
    orbitals = getattr(dm, "mo_coeff", None)
    if orbitals is None:
        return [_eigen(matrix) for matrix in matrices]
    size = matrices.shape[-1]
    orbitals = np.asarray(orbitals).reshape(-1, size, np.shape(orbitals)[-1])
    occupations = np.asarray(dm.mo_occ).reshape(len(orbitals), -1)
    if 2 * len(orbitals) == len(matrices):
        orbitals = np.concatenate([orbitals, orbitals])
        occupations = np.concatenate([occupations > 0, occupations == 2]).astype(float)
    return [occupied(c, n) for c, n in zip(orbitals, occupations, strict=True)]


def _eigen(matrix: Array) -> tuple[Array, Array]:
    values, vectors = np.linalg.eigh(matrix)
    kept = np.abs(values) > RANK
    return np.ascontiguousarray(vectors[:, kept]), values[kept]
