"""A minimal basis of free-atom functions: what tells core from valence, sigma from pi, and atom from atom."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from .errors import UnpairedError

Array = NDArray[np.float64]


class BeyondMinimalBasis(UnpairedError):
    """Free-atom functions cannot describe this state (a diffuse orbital, an element without a set)."""

    tag = "beyond-minimal-basis"


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
