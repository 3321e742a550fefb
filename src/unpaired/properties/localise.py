"""Localised orbitals: as few atoms per orbital as an orthogonal rotation allows."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

SWEEPS = 200
SMALLEST_TURN = 1e-7
"""Radians; a sweep whose turns are all smaller ends the search."""


def localising_rotation(coefficients: Array, atom: NDArray[np.int_]) -> Array:
    """Orthogonal matrix U such that the columns of `coefficients @ U` sit on few atoms.

    Maximises sum_iA (sum of squares of orbital i on atom A)^2 (J. Pipek and P. G. Mezey, J. Chem. Phys. 90,
    4916 (1989), from memory) by turning pairs of orbitals. `coefficients` has orthonormal columns in an
    orthonormal basis of atomic functions, shape (functions, orbitals); `atom` is the atom of each function.
    The start is a pivoted Cholesky decomposition of the projector, so that the result does not depend on how
    the orbitals were mixed before.
    """
    count = coefficients.shape[1]
    rotation = _cholesky_start(coefficients)
    current = coefficients @ rotation
    first = np.flatnonzero(np.diff(atom, prepend=-1))
    for _ in range(SWEEPS):
        largest = 0.0
        for i in range(count):
            for j in range(i + 1, count):
                one, two = current[:, i], current[:, j]
                cross = np.add.reduceat(one * two, first)
                split = np.add.reduceat(one * one - two * two, first) / 2
                a, b = cross @ cross - split @ split, 2 * cross @ split
                angle = np.arctan2(b, -a) / 4
                if abs(angle) < SMALLEST_TURN:
                    continue
                largest = max(largest, float(abs(angle)))
                cos, sin = np.cos(angle), np.sin(angle)
                turn = np.array([[cos, -sin], [sin, cos]])
                current[:, [i, j]] = current[:, [i, j]] @ turn
                rotation[:, [i, j]] = rotation[:, [i, j]] @ turn
        if largest < SMALLEST_TURN:
            break
    return rotation


def _cholesky_start(coefficients: Array) -> Array:
    """The orthogonal rotation nearest to orbitals that each start from one atomic function."""
    rest = coefficients @ coefficients.T
    chosen = []
    for _ in range(coefficients.shape[1]):
        diagonal = np.round(np.diag(rest), 8)  # equal atoms are taken in their order, not by the last digit
        pivot = int(np.argmax(diagonal))
        column = rest[:, pivot] / np.sqrt(rest[pivot, pivot])
        rest = rest - np.outer(column, column)
        chosen.append(column)
    left, _, right = np.linalg.svd(coefficients.T @ np.array(chosen).T)
    return np.asarray(left @ right)
