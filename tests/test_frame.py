"""Axes that turn with the molecule."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from unpaired.electronic.frame import molecular_axes

ANGLES = np.deg2rad([0.0, 120.0, 240.0])
SHAPES = {
    "bent": (np.array([8.0, 1.0, 1.0]), np.array([[0.0, 0, 0], [0, 1.4, 1.1], [0, -1.4, 1.1]])),
    "trigonal": (
        np.array([6.0, 1.0, 1.0, 1.0]),
        np.vstack([np.zeros(3), 2 * np.c_[np.cos(ANGLES), np.sin(ANGLES), np.zeros(3)]]),
    ),
    "tetrahedral": (
        np.array([6.0, 1.0, 1.0, 1.0, 1.0]),
        np.array([[0.0, 0, 0], [1, 1, 1], [1, -1, -1], [-1, 1, -1], [-1, -1, 1]]),
    ),
    "general": (
        np.array([6.0, 7.0, 8.0, 1.0]),
        np.array([[0.0, 0, 0], [2.1, 0, 0], [0, 2.3, 0], [1, 1, 2.0]]),
    ),
}


@pytest.mark.parametrize("shape", SHAPES)
@settings(max_examples=20, deadline=None)
@given(seed=st.integers(0, 2**32 - 1))
def test_axes_turn_with_the_nuclei(shape: str, seed: int) -> None:
    """Seen from its axes, the turned molecule is the same up to the signs of the axes."""
    charges, coordinates = SHAPES[shape]
    random = np.random.default_rng(seed)
    turned = coordinates @ Rotation.random(rng=random).as_matrix().T + random.normal(size=3)

    def seen(points: np.ndarray) -> np.ndarray:
        axes = molecular_axes(charges, points)
        return np.abs((points - charges @ points / charges.sum()) @ axes.T)

    assert seen(turned) == pytest.approx(seen(coordinates), abs=1e-8)


@pytest.mark.parametrize(
    ("charges", "coordinates"),
    [(np.array([1.0]), np.zeros((1, 3))), (np.array([6.0, 7.0]), np.array([[0.0, 0, 0], [1.0, 1.0, 1.0]]))],
)
def test_axes_exist_for_atoms_and_lines(charges: np.ndarray, coordinates: np.ndarray) -> None:
    axes = molecular_axes(charges, coordinates)
    assert axes @ axes.T == pytest.approx(np.eye(3), abs=1e-12)
