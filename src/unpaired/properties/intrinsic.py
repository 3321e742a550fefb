"""Intrinsic atomic orbitals."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ..minimal import BeyondMinimalBasis, MinimalBasis

Array = NDArray[np.float64]

SMALLEST_IMAGE = 1e-3
"""Least squared length that a combination of occupied orbitals may keep in the minimal basis."""


def intrinsic_orbitals(occupied: Array, overlap: Array, minimal: MinimalBasis) -> Array:
    """Intrinsic atomic orbitals: free-atom functions polarised so that they span the occupied orbitals.

    G. Knizia, J. Chem. Theory Comput. 9, 4834 (2013), from memory: A = (1 + 2 O O' - O - O') P12 with the
    projectors O on the occupied orbitals and O' on their images in the minimal basis, then symmetric
    orthogonalisation. Shape (basis functions, free-atom functions), orthonormal, in the order of `minimal`.
    Raises BeyondMinimalBasis if an occupied orbital has nearly nothing of free-atom functions.
    """
    into = np.linalg.solve(overlap, minimal.cross)
    image = into @ np.linalg.solve(minimal.own, minimal.cross.T @ occupied)
    least = np.linalg.eigvalsh(image.T @ overlap @ image)[0]
    if least < SMALLEST_IMAGE:
        raise BeyondMinimalBasis("an occupied orbital is too diffuse to be made of free-atom functions")
    image = orthonormal(image, overlap)
    part = occupied @ (occupied.T @ (overlap @ into))
    part_image = image @ (image.T @ (overlap @ into))
    both = occupied @ (occupied.T @ (overlap @ part_image))
    return orthonormal(into + 2 * both - part - part_image, overlap)


def orthonormal(vectors: Array, overlap: Array) -> Array:
    """Symmetric orthogonalisation of the columns of `vectors` in a metric."""
    values, turn = np.linalg.eigh(vectors.T @ overlap @ vectors)
    return np.asarray(vectors @ (turn / np.sqrt(values)) @ turn.T)
