"""Line shapes: absorption of unit area and its derivatives, by peak-to-peak width of the first derivative.

    Gaussian    f = exp(-x^2 / 2 s^2) / (s sqrt(2 pi)),       s = width / 2
    Lorentzian  f = (h / pi) / (h^2 + x^2),                   h = width sqrt(3) / 2

(extrema of f' at +-s and +-h/sqrt(3): elementary calculus). A mixture adds the two by area, both
of one width.

Field modulation of peak-to-peak amplitude A, detected in the n-th harmonic and divided by the weak-modulation
response, averages the n-th derivative over x + (A/2) u with the weight (1 - u^2)^(n - 1/2) on -1..1: the
integral representation of the Bessel function J_n (Abramowitz and Stegun 9.1.20), from memory. The average is
taken by Gauss-Gegenbauer quadrature.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Shape:
    """How every line is drawn."""

    peak_to_peak_width: float
    """In the unit of the axis."""
    lorentzian_share: float = 0.0
    """0 is Gaussian, 1 Lorentzian; share of the area in between."""
    derivative: int = 1
    """0 absorption, 1 first derivative, 2 second derivative."""
    modulation: float = 0.0
    """Peak-to-peak amplitude of the field modulation, in the unit of the axis."""

    def __post_init__(self) -> None:
        if not (math.isfinite(self.peak_to_peak_width) and self.peak_to_peak_width > 0):
            raise InputError(f"the peak-to-peak width must be positive, found {self.peak_to_peak_width:g}")
        if not 0 <= self.lorentzian_share <= 1:
            raise InputError(f"the Lorentzian share lies between 0 and 1, found {self.lorentzian_share:g}")
        if self.derivative not in (0, 1, 2):
            raise InputError(f"the derivative is 0, 1 or 2, found {self.derivative}")
        if not (math.isfinite(self.modulation) and self.modulation >= 0):
            raise InputError(f"the field modulation cannot be negative, found {self.modulation:g}")
        if self.modulation and not self.derivative:
            raise InputError("field modulation belongs to a derivative; leave it out for the absorption")


def gaussian(x: FloatArray, peak_to_peak_width: float, derivative: int) -> FloatArray:
    """The Gaussian of unit area (derivative 0) or its first or second derivative at x."""
    s = peak_to_peak_width / 2
    u = x / s
    absorption = np.exp(-(u**2) / 2) / (s * math.sqrt(2 * math.pi))
    factor = (np.ones_like(u), -u / s, (u**2 - 1) / s**2)[derivative]
    return absorption * factor


def lorentzian(x: FloatArray, peak_to_peak_width: float, derivative: int) -> FloatArray:
    """The Lorentzian of unit area (derivative 0) or its first or second derivative at x."""
    h = peak_to_peak_width * math.sqrt(3) / 2
    square = h**2 + x**2
    factor = (1 / square, -2 * x / square**2, (6 * x**2 - 2 * h**2) / square**3)[derivative]
    return h / math.pi * factor


def line(x: FloatArray, shape: Shape) -> FloatArray:
    """One line of unit area centred at 0, as `shape` says; x and the result of any one shape."""
    if not shape.modulation:
        return _mixture(x, shape)
    from scipy.special import roots_gegenbauer

    nodes = 16 + math.ceil(6 * shape.modulation / shape.peak_to_peak_width)
    places, weights = roots_gegenbauer(nodes, shape.derivative)
    moved = (_mixture(x + shape.modulation / 2 * u, shape) * w for u, w in zip(places, weights, strict=True))
    total: FloatArray = sum(moved, np.zeros_like(x)) / weights.sum()
    return total


def _mixture(x: FloatArray, shape: Shape) -> FloatArray:
    share, width = shape.lorentzian_share, shape.peak_to_peak_width
    total = np.zeros_like(x)
    if share < 1:
        total += (1 - share) * gaussian(x, width, shape.derivative)
    if share > 0:
        total += share * lorentzian(x, width, shape.derivative)
    return total
