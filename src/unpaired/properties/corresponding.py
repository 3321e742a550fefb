"""Corresponding orbitals: the occupied alpha and beta orbitals of one determinant, matched in pairs."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Matrix = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Corresponding:
    """Orbitals of one determinant; its density matrices do not change by the matching."""

    alpha: Matrix
    """Matched alpha orbitals, shape (basis functions, pairs)."""
    beta: Matrix
    """Their beta partners, shape (basis functions, pairs)."""
    overlaps: NDArray[np.float64]
    """<alpha_i|beta_i> between 0 and 1, largest first, shape (pairs,); alpha_i and beta_j are orthogonal."""
    unmatched: Matrix
    """Alpha orbitals without a partner, shape (basis functions, 2S)."""


def occupied(orbitals: Matrix, occupations: Matrix) -> tuple[Matrix, Matrix]:
    """Occupied alpha and beta orbitals, from shapes (2, basis functions, orbitals) and (2, orbitals)."""
    return orbitals[0][:, occupations[0] > 0.5], orbitals[1][:, occupations[1] > 0.5]


def corresponding_orbitals(alpha: Matrix, beta: Matrix, overlap: Matrix) -> Corresponding:
    """Match occupied orbitals by the singular value decomposition of their overlap.

    A. T. Amos and G. G. Hall, Proc. R. Soc. London A 263, 483 (1961), from memory. `alpha` and `beta` have
    shapes (basis functions, n_alpha) and (basis functions, n_beta <= n_alpha), `overlap` is the basis's.
    """
    pairs = beta.shape[1]
    left, values, right = np.linalg.svd(alpha.T @ overlap @ beta, full_matrices=True)
    turned = alpha @ left
    return Corresponding(
        alpha=turned[:, :pairs],
        beta=beta @ right.T,
        overlaps=np.minimum(values, 1.0),
        unmatched=turned[:, pairs:],
    )
