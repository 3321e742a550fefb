"""Vibrations against textbook spring models and brute force."""

import numpy as np
import pytest

from unpaired.constants import ATOMIC_MASS_KG, BOHR_RADIUS_M, HARTREE_J, LIGHT_SPEED_M_S
from unpaired.structures.modes import (
    lowest_mode,
    masses_u,
    normal_modes,
    vibrational_space,
    wavenumber_cm,
)


def springs(coordinates: np.ndarray, constant: float) -> np.ndarray:
    """Hessian of equal springs at rest between all pairs, Eh/bohr^2."""
    size = len(coordinates)
    hessian = np.zeros((size, 3, size, 3))
    for i in range(size):
        for j in range(i):
            along = coordinates[i] - coordinates[j]
            along = along / np.linalg.norm(along)
            block = constant * np.outer(along, along)
            hessian[i, :, i, :] += block
            hessian[j, :, j, :] += block
            hessian[i, :, j, :] -= block
            hessian[j, :, i, :] -= block
    return hessian.reshape(3 * size, 3 * size)


def test_diatomic_has_the_wavenumber_of_its_reduced_mass() -> None:
    """Textbook: nu = sqrt(k/mu)/(2 pi c)."""
    coordinates = np.array([[0, 0, 0], [0, 0, 2.1]])
    modes = normal_modes(springs(coordinates, 1.2), coordinates, np.array([12.0, 16.0]))
    reduced = 12.0 * 16.0 / 28.0 * ATOMIC_MASS_KG
    force = 1.2 * HARTREE_J / BOHR_RADIUS_M**2
    expected = np.sqrt(force / reduced) / (2 * np.pi * LIGHT_SPEED_M_S) / 100
    np.testing.assert_allclose(modes.wavenumbers_cm, [expected], rtol=1e-9)


def test_triangle_of_equal_springs() -> None:
    """Textbook: one breathing mode with 3k/m, a degenerate pair with 3k/(2m)."""
    angles = 2 * np.pi * np.arange(3) / 3
    coordinates = 2.0 * np.column_stack([np.cos(angles), np.sin(angles), 0 * angles])
    modes = normal_modes(springs(coordinates, 0.1), coordinates, np.full(3, 10.0))
    expected = [wavenumber_cm(0.1 * factor / 10.0) for factor in (1.5, 1.5, 3.0)]
    np.testing.assert_allclose(modes.wavenumbers_cm, expected, rtol=1e-9)
    assert modes.zero_point_Eh == pytest.approx(sum(expected) / 2 / 219474.6313, rel=1e-6)


@pytest.mark.parametrize(
    ("coordinates", "modes"),
    [
        ([[0, 0, 0], [0, 0, 2]], 1),
        ([[0, 0, -2], [0, 0, 0], [0, 0, 2]], 4),
        ([[0, 0, 0], [0, 1, 2], [0, -1, 2]], 3),
        ([[0, 0, 0], [0, 1, 2], [0, -1, 2], [2, 0, 1]], 6),
    ],
)
def test_number_of_vibrations(coordinates: list[list[float]], modes: int) -> None:
    """Textbook: 3N-6, 3N-5 for linear molecules."""
    points = np.array(coordinates, dtype=float)
    assert vibrational_space(points, np.ones(len(points))).shape[1] == modes


def test_negative_curvature_is_a_negative_wavenumber() -> None:
    coordinates = np.array([[0, 0, 0], [0, 0, 2.1]])
    hessian = -springs(coordinates, 0.5)
    assert normal_modes(hessian, coordinates, np.array([1.0, 1.0])).wavenumbers_cm[0] < -1000


def test_lowest_mode_of_a_hessian_known_only_by_products() -> None:
    """Against the full diagonalisation; the model differs from the truth by a tenth."""
    random = np.random.default_rng(5)
    coordinates = random.normal(size=(9, 3)) * 3
    masses = masses_u(["C", "C", "N", "O", "H", "H", "H", "F", "H"])
    stretch = springs(coordinates, 0.05)
    bend = random.normal(size=stretch.shape)
    space = np.linalg.svd(stretch)[0][:, :21]
    truth = stretch + 0.002 * space @ space.T @ (bend + bend.T) @ space @ space.T
    model = stretch
    full = normal_modes(truth, coordinates, masses)
    found = lowest_mode(lambda v: truth @ v, model, coordinates, masses, most=20, enough_cm=5.0)
    assert found.wavenumber_cm == pytest.approx(full.wavenumbers_cm[0], abs=0.5)
    assert abs((found.displacement * full.displacements[0]).sum()) > 0.999


def test_masses_are_those_of_the_common_isotopes() -> None:
    """AME values as any table has them (common practice)."""
    np.testing.assert_allclose(masses_u(["H", "C", "O", "F"]), [1.00783, 12.0, 15.99491, 18.99840], atol=1e-5)
