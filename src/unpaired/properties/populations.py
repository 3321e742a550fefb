"""Spin populations: how much of the unpaired spin each atom holds."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ..minimal import MinimalBasis
from .intrinsic import intrinsic_orbitals

Array = NDArray[np.float64]


def spin_populations(
    alpha: Array, beta: Array, overlap: Array, minimal: MinimalBasis, pi: Array | None
) -> tuple[Array, Array | None]:
    """Spin population of every atom, and its part in pi functions (None if `pi` is), each of shape (atoms,).

    Intrinsic atomic orbitals of the occupied alpha and of the occupied beta orbitals, each set spanning its
    orbitals exactly: the populations sum to 2S. `pi` comes from `partition.pi_functions`.
    """
    atoms = int(minimal.atom.max()) + 1
    total = np.zeros(atoms)
    upright = np.zeros(atoms)
    for sign, orbitals in ((1, alpha), (-1, beta)):
        if orbitals.shape[1] == 0:
            continue
        shape = intrinsic_orbitals(orbitals, overlap, minimal).T @ overlap @ orbitals
        np.add.at(total, minimal.atom, sign * np.sum(shape**2, axis=1))
        if pi is not None:
            owner = minimal.atom[np.argmax(np.abs(pi), axis=0)]
            np.add.at(upright, owner, sign * np.sum((pi.T @ shape) ** 2, axis=1))
    return total, None if pi is None else upright
