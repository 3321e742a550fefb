"""Vibrations from second derivatives: wavenumbers, displacements, zero-point energy, the lowest mode by iteration."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..constants import DALTON_ELECTRON_MASSES, HARTREE_CM
from ..molecule import ATOMIC_NUMBER

Floats = NDArray[np.float64]

FLAT_CM = 30.0
"""Modes below this, real or imaginary, are within the noise of grid and thresholds: no proof of anything."""


@dataclass(frozen=True, eq=False)
class Modes:
    """Harmonic vibrations, lowest first; translations and rotations are left out."""

    wavenumbers_cm: Floats
    """Shape (modes,); negative stands for imaginary."""
    displacements: Floats
    """Shape (modes, atoms, 3), Cartesian, each of length 1."""

    @property
    def zero_point_Eh(self) -> float:
        """Half the sum of the real wavenumbers."""
        return float(self.wavenumbers_cm[self.wavenumbers_cm > 0].sum() / 2 / HARTREE_CM)


def masses_u(elements: Sequence[str]) -> Floats:
    """Masses of the most common isotopes in dalton (RDKit's periodic table)."""
    from rdkit import Chem

    table = Chem.GetPeriodicTable()
    return np.array([table.GetMostCommonIsotopeMass(ATOMIC_NUMBER[element]) for element in elements])


def wavenumber_cm(curvature: float) -> float:
    """Wavenumber of a mass-weighted curvature in Eh/(bohr^2 u); negative stands for imaginary."""
    value = np.sqrt(abs(curvature) / DALTON_ELECTRON_MASSES) * HARTREE_CM
    return float(np.copysign(value, curvature))


def vibrational_space(coordinates_bohr: Floats, masses: Floats) -> Floats:
    """Orthonormal mass-weighted directions that are no translation or rotation, shape (3 atoms, modes)."""
    points = coordinates_bohr - np.average(coordinates_bohr, axis=0, weights=masses)
    root = np.sqrt(masses)
    outer = []
    for axis in np.eye(3):
        outer.append((root[:, None] * axis).ravel())
        outer.append((root[:, None] * np.cross(axis, points)).ravel())
    vectors = np.array(outer)
    left, size, _ = np.linalg.svd(vectors.T, full_matrices=True)
    rank = int((size > 1e-3 * size[0]).sum())  # five for linear structures
    return np.asarray(left[:, rank:])


def normal_modes(hessian: Floats, coordinates_bohr: Floats, masses: Floats) -> Modes:
    """Harmonic modes of a Hessian (3 atoms, 3 atoms) in Eh/bohr^2, with masses (atoms,) in dalton.

    E. B. Wilson, J. C. Decius, P. C. Cross, "Molecular Vibrations", 1955.
    """
    atoms = len(masses)
    root = np.repeat(np.sqrt(masses), 3)
    space = vibrational_space(coordinates_bohr, masses)
    weighted = (hessian + hessian.T) / 2 / np.outer(root, root)
    curvatures, vectors = np.linalg.eigh(space.T @ weighted @ space)
    cartesian = ((space @ vectors).T / root).reshape(-1, atoms, 3)
    cartesian = cartesian / np.linalg.norm(cartesian.reshape(len(cartesian), -1), axis=1)[:, None, None]
    return Modes(np.array([wavenumber_cm(value) for value in curvatures]), cartesian)


@dataclass(frozen=True, eq=False)
class LowestMode:
    """The lowest vibration, found without a full Hessian."""

    wavenumber_cm: float
    displacement: Floats
    """Shape (atoms, 3), Cartesian, length 1."""
    residual_cm: float
    """The square of some wavenumber lies within this one's square of ours.

    That it is the lowest rests on the two start directions: a mode that both are blind to stays hidden.
    """
    products: int
    """How many times the Hessian was multiplied by a direction."""


def lowest_mode(
    product: Callable[[Floats], Floats],
    model_hessian: Floats,
    coordinates_bohr: Floats,
    masses: Floats,
    most: int = 12,
    enough_cm: float = 60.0,
) -> LowestMode:
    """The lowest eigenvector of a Hessian that is only known through its products with directions.

    E. R. Davidson, J. Comput. Phys. 17, 87 (1975), preconditioned by `model_hessian` (3 atoms, 3 atoms), such as the
    Hessian of a smaller basis set; `product` takes and gives a Cartesian (3 atoms,) array in Eh/bohr^2. Starts from the
    model's lowest mode and from a mixture of all modes.
    """
    root = np.repeat(np.sqrt(masses), 3)
    space = vibrational_space(coordinates_bohr, masses)
    model = space.T @ ((model_hessian + model_hessian.T) / 2 / np.outer(root, root)) @ space
    model_values, model_vectors = np.linalg.eigh(model)
    basis: list[Floats] = []
    images: list[Floats] = []
    fresh = _first_directions(model_values, model_vectors)
    value, vector, residual = 0.0, fresh[0], np.inf
    while fresh and len(basis) < most:
        for direction in fresh:
            cartesian = space @ direction / root
            length = float(np.linalg.norm(cartesian))
            images.append(space.T @ (product(cartesian / length) * length / root))
            basis.append(direction)
        whole = np.array(basis)
        small = whole @ np.array(images).T
        values, vectors = np.linalg.eigh((small + small.T) / 2)
        value, weights = float(values[0]), vectors[:, 0]
        vector = weights @ whole
        error = weights @ np.array(images) - value * vector
        residual = float(np.linalg.norm(error))
        if wavenumber_cm(residual) <= enough_cm:
            break
        shift = np.maximum(model_values - value, 0.05 * max(float(model_values[-1]), 1e-12))
        step = model_vectors @ ((model_vectors.T @ error) / shift)
        for _ in range(2):
            step = step - whole.T @ (whole @ step)
        size = float(np.linalg.norm(step))
        fresh = [step / size] if size > 1e-10 else []
    cartesian = (space @ vector / root).reshape(-1, 3)
    return LowestMode(
        wavenumber_cm(value), cartesian / np.linalg.norm(cartesian), wavenumber_cm(residual), len(basis)
    )


def _first_directions(values: Floats, vectors: Floats) -> list[Floats]:
    """The model's lowest mode, and a mixture of all others, softer ones more.

    The mixture keeps an iteration in a symmetric structure from never seeing the modes of another symmetry.
    """
    first = np.asarray(vectors[:, 0])
    if len(values) == 1:
        return [first]
    soft = np.maximum(values[1:] - values[0], 0.01 * max(float(values[-1]), 1e-12))
    mixture = vectors[:, 1:] @ (np.cos(1.0 + np.arange(1, len(values)) ** 1.5) / soft)
    return [first, np.asarray(mixture / np.linalg.norm(mixture))]
