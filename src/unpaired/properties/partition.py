"""Where a spin density comes from: the unmatched orbitals themselves, and the polarisation of each pair."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..minimal import MinimalBasis
from .corresponding import Corresponding
from .intrinsic import intrinsic_orbitals
from .localise import localising_rotation

Array = NDArray[np.float64]

NAMED_SHARE = 0.12
"""An atom that holds at least this share of a pair is part of its name."""
FLAT_BOHR = 0.05
"""Atoms that all lie this close to a plane make a molecule planar."""


@dataclass(frozen=True, eq=False)
class Pair:
    """One localised pair of electrons and what its polarisation does to the nuclei."""

    atoms: tuple[int, ...]
    """0-based atoms it sits on, ascending."""
    kind: str
    """core, valence, valence sigma or valence pi."""
    spin_density_au: Array
    """alpha^2 - beta^2 at every nucleus, bohr^-3, shape (atoms,)."""

    def name(self, labels: Sequence[str]) -> str:
        """Atoms joined by hyphens, such as C1-H4."""
        return "-".join(labels[atom] for atom in self.atoms)


def direct_at_nuclei(pairs: Corresponding, ao_at_nuclei: Array) -> Array:
    """Spin density of the unmatched orbitals at every nucleus, bohr^-3, shape (atoms,).

    What is missing to the full spin density is the polarisation of the matched pairs.
    """
    return np.asarray(np.sum((ao_at_nuclei @ pairs.unmatched) ** 2, axis=1))


def localised_pairs(
    pairs: Corresponding, overlap: Array, ao_at_nuclei: Array, minimal: MinimalBasis, pi: Array | None
) -> tuple[Pair, ...]:
    """Matched pairs turned into local ones, core and valence apart, sigma and pi apart.

    One rotation turns alpha and beta, so that the sum over pairs of alpha^2 - beta^2 stays as it is.
    `pi` holds the free-atom functions of pi kind, shape (free-atom functions, pi functions), or None where
    there is no plane or axis.
    """
    count = len(pairs.overlaps)
    if count == 0:
        return ()
    middle = (pairs.alpha + pairs.beta) / np.sqrt(2 * (1 + pairs.overlaps))  # orthonormal
    atomic = intrinsic_orbitals(middle, overlap, minimal)
    shape = atomic.T @ overlap @ middle
    core_functions = np.eye(len(minimal.atom))[:, minimal.core]
    core, valence = _split(shape, core_functions, min(core_functions.shape[1], count))
    classes = [("core", core)]
    if pi is None:
        classes.append(("valence", valence))
    else:
        turned = shape @ valence
        like_pi = np.linalg.svd(pi.T @ turned, compute_uv=False)
        flat, upright = _split(turned, pi, int(np.sum(like_pi**2 > 0.5)))
        classes += [("valence sigma", valence @ upright), ("valence pi", valence @ flat)]
    found = []
    for kind, space in classes:
        if space.shape[1] == 0:
            continue
        rotation = space @ localising_rotation(shape @ space, minimal.atom)
        alpha, beta = ao_at_nuclei @ pairs.alpha @ rotation, ao_at_nuclei @ pairs.beta @ rotation
        density = alpha**2 - beta**2
        on_atoms = _atom_shares(shape @ rotation, minimal.atom)
        found += [
            Pair(_named(on_atoms[:, place]), kind, density[:, place]) for place in range(rotation.shape[1])
        ]
    return tuple(sorted(found, key=lambda pair: (pair.kind != "core", pair.atoms, pair.kind)))


def pi_functions(coordinates_bohr: Array, minimal: MinimalBasis) -> Array | None:
    """Free-atom p functions perpendicular to the plane, or to the axis, of the nuclei; None for no plane.

    Shape (free-atom functions, pi functions), orthonormal coefficients; an atom alone has no plane.
    """
    directions = perpendicular(coordinates_bohr)
    if directions is None:
        return None
    shells = np.flatnonzero(np.any(minimal.axis != 0, axis=1) & ~minimal.core).reshape(-1, 3)
    columns = []
    for shell in shells:
        for direction in directions:
            column = np.zeros(len(minimal.atom))
            column[shell] = minimal.axis[shell] @ direction
            columns.append(column)
    return np.array(columns).reshape(-1, len(minimal.atom)).T


def perpendicular(coordinates_bohr: Array) -> Array | None:
    """Unit vectors that leave the plane (1) or the axis (2) of all nuclei, shape (1 or 2, 3), or None."""
    if len(coordinates_bohr) < 2:
        return None
    centred = coordinates_bohr - coordinates_bohr.mean(axis=0)
    _, _, axes = np.linalg.svd(centred)
    away = np.abs(centred @ axes.T).max(axis=0) < FLAT_BOHR
    return np.asarray(axes[away]) if away.any() else None


def _split(shape: Array, functions: Array, count: int) -> tuple[Array, Array]:
    """Rotations to the `count` orbitals that resemble `functions` most, and to all others."""
    _, _, turn = np.linalg.svd(functions.T @ shape, full_matrices=True)
    return turn[:count].T, turn[count:].T


def _atom_shares(shape: Array, atom: NDArray[np.int_]) -> Array:
    """Share of every atom in every orbital, shape (atoms, orbitals)."""
    shares = np.zeros((int(atom.max()) + 1, shape.shape[1]))
    np.add.at(shares, atom, shape**2)
    return shares


def _named(shares: Array) -> tuple[int, ...]:
    return tuple(int(atom) for atom in np.flatnonzero(shares >= min(NAMED_SHARE, shares.max())))
