"""Densities and occupations to start from."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

DENSITIES = {
    "atomic superposition": "minao",
    "core Hamiltonian": "1e",
    "free atoms": "atom",
    "Hueckel": "huckel",
}
"""Starts made of the nuclei alone, by PySCF's name."""


def density_from_nuclei(field: Any, name: str) -> Any:
    """A start that needs no earlier solution; the superposition of atoms where the named one cannot be made."""
    import warnings

    try:
        with warnings.catch_warnings():  # PySCF's own atoms call a function that it has deprecated
            warnings.simplefilter("ignore", DeprecationWarning)
            return field.get_init_guess(key=DENSITIES[name])
    except (KeyError, RuntimeError, ValueError, NotImplementedError):
        return field.get_init_guess(key="minao")


def turned(orbitals: Array, occupations: Array, alpha: float = 45.0, beta: float = 0.0) -> Array:
    """Density of an unrestricted solution whose HOMO and LUMO are rotated into each other, shape (2, n, n).

    Angles in degrees, one for each spin: opposite ones break the symmetry between the halves of a bond.
    """
    rotated = orbitals.copy()
    for c, n, degrees in zip(rotated, occupations, (alpha, beta), strict=True):
        full, empty = np.flatnonzero(n > 0), np.flatnonzero(n == 0)
        if len(full) and len(empty):
            angle = np.deg2rad(degrees)
            highest, lowest = c[:, full[-1]].copy(), c[:, empty[0]].copy()
            c[:, full[-1]] = np.cos(angle) * highest + np.sin(angle) * lowest
            c[:, empty[0]] = np.cos(angle) * lowest - np.sin(angle) * highest
    return np.asarray((rotated * occupations[:, None, :]) @ rotated.transpose(0, 2, 1))


def symmetrised(density: Array, species: Iterable[Array], overlap: Array) -> Array:
    """The part of a density that mixes no two symmetry species; `species` are columns that span each."""
    blocks = []
    for columns in species:
        metric = columns.T @ overlap @ columns
        blocks.append(columns @ np.linalg.solve(metric, columns.T @ overlap))
    return np.asarray(sum(block @ density @ block.T for block in blocks))


def excited(occupations: Array, energies: Array, deep: int, high: int) -> Iterator[tuple[str, Array]]:
    """Occupations with one electron moved between frontier orbitals, by name; the field's own shape.

    Unrestricted: within beta and within alpha. Restricted-open: the open shell changes places with a doubly occupied
    or with an empty orbital.
    """
    if occupations.ndim == 1:
        order = np.argsort(energies, kind="stable")
        double, single, none = ([k for k in order if occupations[k] == n] for n in (2, 1, 0))
        pairs = [(a, b) for a in single for b in [*double[::-1][:deep], *none[:high]]]
        for a, b in pairs:
            changed = occupations.copy()
            changed[[a, b]] = changed[[b, a]]
            yield f"open shell exchanged with orbital {b + 1}", changed
        return
    for spin, name in ((1, "beta"), (0, "alpha")):
        order = np.argsort(energies[spin], kind="stable")
        full = [k for k in order if occupations[spin][k] > 0][::-1][:deep]
        empty = [k for k in order if occupations[spin][k] == 0][:high]
        for i, a in enumerate(full):
            for j, b in enumerate(empty):
                changed = occupations.copy()
                changed[spin][[a, b]] = 0.0, 1.0
                yield f"{name} electron moved from HOMO-{i} to LUMO+{j}", changed


def projected(small: Any, large: Any, orbitals: Array, occupations: Array) -> tuple[Array, Array]:
    """Occupied orbitals of one spin carried to another basis and completed: (orbitals, occupations).

    Least squares in the large basis, then symmetric orthonormalisation; virtuals are the complement.
    """
    from pyscf import gto

    overlap = large.intor("int1e_ovlp")
    cross = gto.intor_cross("int1e_ovlp", large, small)
    count = int((occupations > 0).sum())
    values, vectors = np.linalg.eigh(overlap)
    kept = values > 1e-8
    to_orthonormal = vectors[:, kept] / np.sqrt(values[kept])
    carried = to_orthonormal.T @ cross @ orbitals[:, occupations > 0]
    left, _, right = np.linalg.svd(carried, full_matrices=True)
    occupied = left[:, :count] @ right
    complete = np.hstack([occupied, left[:, count:]])
    filled = np.zeros(complete.shape[1])
    filled[:count] = 1.0
    return to_orthonormal @ complete, filled
