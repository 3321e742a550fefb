"""Is a converged solution a minimum among its neighbours? The lowest curvature and its direction."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .curvature import Curvature, curvature

Array = NDArray[np.float64]

UNSTABLE_Eh = -1e-4
"""Curvature below which a solution counts as unstable; free rotations of a degenerate state give zero."""
NEAR_ZERO_Eh = 0.01
"""Below this a curvature from the coarse kernel is computed again with the field's own grid."""
ROUGH, FINE = 0.002, 0.0005
"""Residuals at which the lowest root counts as found. At 0.03 a higher root was taken for the lowest in 9 of 85 cases,
and an unstable solution for a stable one in 3 (against the whole Hessian's eigenvalues)."""
STARTS = 6


@dataclass(frozen=True)
class Verdict:
    """Outcome of a stability test."""

    stable: bool | None
    """None where it could not be tested."""
    lowest_Eh: float | None
    """Lowest curvature (eigenvalue of the orbital Hessian); None if not tested or nothing can rotate."""
    direction: Array | None = None
    """Rotation with that curvature, unit length."""
    note: str = ""
    """Why it could not be tested."""


def internal_stability(field: Any) -> tuple[Verdict, Curvature | None]:
    """Test real rotations within the method's own kind (UHF to UHF, ROHF to ROHF).

    First roughly, with a coarse kernel; a curvature near zero is settled with the field's own grid.
    """
    try:
        rough = curvature(field)
        if not len(rough.diagonal):
            return Verdict(True, None), rough
        lowest, direction = lowest_root(rough.product, rough.diagonal, ROUGH)
        if abs(lowest) < NEAR_ZERO_Eh:
            fine = curvature(field, response_grid=None)
            lowest, direction = lowest_root(fine.product, fine.diagonal, FINE, start=direction)
            rough = fine
    except NotImplementedError as error:
        return Verdict(None, None, note=f"the response of this functional does not exist ({error})"), None
    return Verdict(lowest >= UNSTABLE_Eh, lowest, direction), rough


def lowest_root(
    product: Callable[[Array], Array],
    diagonal: Array,
    residual: float,
    start: Array | None = None,
    most: int = 40,
) -> tuple[float, Array]:
    """Lowest eigenvalue and vector of a symmetric operator by Davidson's method, one new vector a step.

    Starts from the smallest diagonal elements, each with a little of everything else mixed in (by a fixed
    formula), so that no symmetry keeps the root hidden. Stops when the residual norm is below `residual`.
    """
    size = len(diagonal)
    places = np.argsort(diagonal, kind="stable")[: min(size, STARTS)]
    noise = np.cos(np.outer(np.arange(1, len(places) + 1), 1.0 + np.arange(size) ** 1.5))
    trial = 0.05 * noise / (1 + np.abs(diagonal)) / np.sqrt(size)
    trial[np.arange(len(places)), places] += 1
    if start is not None:
        trial = np.vstack([start, trial])
    basis, images = np.zeros((0, size)), np.zeros((0, size))
    value, vector = np.inf, trial[0]
    for _ in range(most):
        fresh = _orthonormal(trial, basis)
        if not len(fresh):
            break
        basis, images = np.vstack([basis, fresh]), np.vstack([images, product(fresh)])
        values, mixes = np.linalg.eigh(_symmetric(basis @ images.T))
        value, vector = float(values[0]), mixes[:, 0] @ basis
        wrong = mixes[:, 0] @ images - value * vector
        if np.linalg.norm(wrong) < residual:
            break
        below = diagonal - value
        trial = (wrong / np.where(np.abs(below) < 0.05, np.copysign(0.05, below), below))[None]
    return value, vector


def _orthonormal(vectors: Array, basis: Array) -> Array:
    """What is new in `vectors` beside `basis`, orthonormal rows."""
    kept: list[Array] = []
    for vector in vectors:
        for _ in range(2):
            for other in (basis, np.array(kept).reshape(-1, basis.shape[1])):
                vector = vector - (other @ vector) @ other
        norm = float(np.linalg.norm(vector))
        if norm > 1e-6:
            kept.append(vector / norm)
    return np.array(kept).reshape(-1, basis.shape[1])


def _symmetric(matrix: Array) -> Array:
    return np.asarray(0.5 * (matrix + matrix.T))
