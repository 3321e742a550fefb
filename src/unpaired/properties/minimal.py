"""A minimal basis of free-atom functions: what tells core from valence, sigma from pi, and atom from atom."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class MinimalBasis:
    """Free-atom functions and their overlap with the basis of the calculation."""

    cross: Array
    """<basis function|free-atom function>, shape (basis functions, free-atom functions)."""
    own: Array
    """Overlap among the free-atom functions."""
    atom: NDArray[np.int_]
    """0-based atom of each function."""
    core: NDArray[np.bool_]
    """True for the shells below the valence shells of the free atom."""
    axis: Array
    """Direction of a p function as a unit vector, zeros for every other function; shape (functions, 3)."""


def intrinsic_orbitals(occupied: Array, overlap: Array, minimal: MinimalBasis) -> Array:
    """Intrinsic atomic orbitals: free-atom functions polarised so that they span the occupied orbitals.

    G. Knizia, J. Chem. Theory Comput. 9, 4834 (2013), from memory: A = (1 + 2 O O' - O - O') P12 with the
    projectors O on the occupied orbitals and O' on their images in the minimal basis, then symmetric
    orthogonalisation. Shape (basis functions, free-atom functions), orthonormal, in the order of `minimal`.
    """
    into = np.linalg.solve(overlap, minimal.cross)
    image = into @ np.linalg.solve(minimal.own, minimal.cross.T @ occupied)
    image = orthonormal(image, overlap)
    part = occupied @ (occupied.T @ (overlap @ into))
    part_image = image @ (image.T @ (overlap @ into))
    both = occupied @ (occupied.T @ (overlap @ part_image))
    return orthonormal(into + 2 * both - part - part_image, overlap)


def orthonormal(vectors: Array, overlap: Array) -> Array:
    """Symmetric orthogonalisation of the columns of `vectors` in a metric."""
    values, turn = np.linalg.eigh(vectors.T @ overlap @ vectors)
    return np.asarray(vectors @ (turn / np.sqrt(values)) @ turn.T)
