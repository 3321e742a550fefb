"""Spin projection of a UHF determinant after variation, exact for any S.

Loewdin's projector (P.-O. Loewdin, Phys. Rev. 97, 1509 (1955), from memory) as an integral over rotations b
about the y axis: with x = cos b the part of spin s of a determinant with M_S = S has the weight
(2s+1)/2 int dx d^s_SS(b) W(b), W(b) = <determinant|exp(-i b S_y)|determinant>. In corresponding orbitals
with overlaps d_i every factor is a polynomial in p = cos^2(b/2) and q = 1 - p: W = p^S prod_i (p + q d_i^2).
The projected one-electron density follows in the same way, so that Gauss-Legendre quadrature with enough
points is exact.

For UHF only: a Kohn-Sham determinant describes electrons that do not interact, and must have <S^2> above
S(S+1) where the true spin density is negative, so projecting it removes what should stay.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from .corresponding import Corresponding

Vector = NDArray[np.float64]
Matrix = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Projection:
    """The part of a determinant that has pure spin S, normalised."""

    spin_density_matrix: Matrix
    """Alpha minus beta for M_S = S, shape (basis functions, basis functions), symmetric, of trace 2S."""
    pure_spin_weight: float
    """Weight of spin S in the determinant, 0..1."""


def project(pairs: Corresponding) -> Projection:
    """Project a determinant on spin S, half the number of its unmatched orbitals (S > 0)."""
    twice = pairs.unmatched.shape[1]
    p, q, weight = _quadrature(pairs)
    factors = _factors(p, q, pairs.overlaps)
    others = _products_without_one(factors)
    volume = (twice + 1) / 2 * weight

    norm = float(volume @ (p**twice * np.prod(factors, axis=0)))
    # Matched pair i: tensor component 0 gives aa - bb, component 1 gives aa - d ab.
    component_0 = others @ (volume * p ** (twice + 1))
    component_1 = math.sqrt(twice) * others @ (volume * p**twice * q)
    open_1 = math.sqrt(twice) * float(volume @ (p ** (twice - 1) * q * np.prod(factors, axis=0)))

    spin = twice / 2
    share_0 = spin / (spin + 1)
    share_1 = math.sqrt(share_0 * 2 / (spin + 1))
    alpha, beta, unmatched = pairs.alpha, pairs.beta, pairs.unmatched
    aa = share_0 * component_0 + share_1 * component_1
    ab = -share_1 * component_1 * pairs.overlaps
    density = (alpha * aa) @ alpha.T - (beta * (share_0 * component_0)) @ beta.T
    mixed = (alpha * ab) @ beta.T
    density += (mixed + mixed.T) / 2 + (share_0 * norm + share_1 * open_1) * unmatched @ unmatched.T
    return Projection(spin_density_matrix=density / norm, pure_spin_weight=norm)


def spin_weights(pairs: Corresponding, count: int | None = None) -> Vector:
    """Weights of the spins S, S+1, S+2, ... in the determinant; they sum to 1 if `count` is None (all)."""
    twice = pairs.unmatched.shape[1]
    highest = len(pairs.overlaps) if count is None else min(count - 1, len(pairs.overlaps))
    p, q, weight = _quadrature(pairs)
    rotated = weight * p**twice * np.prod(_factors(p, q, pairs.overlaps), axis=0)
    jacobi = _jacobi(p - q, twice, highest)
    return np.array(
        [(twice + 2 * step + 1) / 2 * float(rotated @ jacobi[step]) for step in range(highest + 1)]
    )


def s_squared(pairs: Corresponding) -> float:
    """<S^2> of the determinant: S(S+1) + sum_i (1 - d_i^2)."""
    spin = pairs.unmatched.shape[1] / 2
    return float(spin * (spin + 1) + np.sum(1 - pairs.overlaps**2))


def s_squared_without_next_spin(pairs: Corresponding) -> float:
    """<A S^2 A> / <A A> with A = S^2 - (S+1)(S+2): the first contaminant is removed, all else kept.

    The moments of K = S^2 - S(S+1) are exact: on W/p^S = sum_m v_m q^m with v_m = (-1)^m e_m(1 - d_i^2)
    (elementary symmetric polynomials) K is the Jacobi operator (K v)_m = m(m+2S+1) v_m - (m+1)^2 v_(m+1), and
    <K^n> is the constant term of K^n v.
    """
    twice = pairs.unmatched.shape[1]
    spin = twice / 2
    series = np.zeros(4)
    series[0] = 1.0
    for missing in 1 - pairs.overlaps**2:
        series[1:] -= missing * series[:-1]
    moments = []
    for _ in range(3):
        order = np.arange(len(series) - 1)
        series = order * (order + twice + 1) * series[:-1] - (order + 1) ** 2 * series[1:]
        moments.append(float(series[0]))
    first, second, third = moments
    gap = twice + 2  # (S+1)(S+2) - S(S+1)
    norm = second - 2 * gap * first + gap**2
    return float(spin * (spin + 1) + (third - 2 * gap * second + gap**2 * first) / norm)


def _quadrature(pairs: Corresponding) -> tuple[Vector, Vector, Vector]:
    """cos^2(b/2), sin^2(b/2) and weights of Gauss-Legendre points in cos b, enough to be exact."""
    degree = 2 * (len(pairs.overlaps) + pairs.unmatched.shape[1])
    x, weight = np.polynomial.legendre.leggauss(degree // 2 + 1)
    return (1 + x) / 2, (1 - x) / 2, weight


def _factors(p: Vector, q: Vector, overlaps: Vector) -> Matrix:
    """p + q d_i^2, shape (pairs, points)."""
    return np.asarray(p + np.outer(overlaps**2, q))


def _products_without_one(factors: Matrix) -> Matrix:
    """For every pair the product over all others, shape (pairs, points); without division: some vanish."""
    ones = np.ones((1, factors.shape[1]))
    before = np.cumprod(np.vstack([ones, factors[:-1]]), axis=0)[: len(factors)]
    after = np.cumprod(np.vstack([ones, factors[:0:-1]]), axis=0)[: len(factors)][::-1]
    return np.asarray(before * after)


def _jacobi(x: Vector, beta: int, highest: int) -> Matrix:
    """Jacobi polynomials P_k^(0, beta)(x), k = 0..highest, by their three-term recurrence.

    d^s_SS(b) = cos^(2S)(b/2) P_(s-S)^(0, 2S)(cos b). NIST Digital Library of Mathematical Functions, 18.9.
    """
    values = np.ones((highest + 1, len(x)))
    if highest > 0:
        values[1] = 1 + (beta + 2) * (x - 1) / 2
    for k in range(2, highest + 1):
        total = 2 * k + beta
        left = 2 * k * (k + beta) * (total - 2)
        middle = (total - 1) * (total * (total - 2) * x - beta**2)
        right = 2 * (k - 1) * (k + beta - 1) * total
        values[k] = (middle * values[k - 1] - right * values[k - 2]) / left
    return values
