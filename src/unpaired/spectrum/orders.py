"""First- and second-order line positions of one group of equivalent nuclei.

Second order. The flip terms (a_k/2)(S+ J_k- + S- J_k+) act twice through the other electron level, which
lies the resonance energy h nu away whatever the nuclei do. For groups k and l this gives, in the level
m_S = +-1/2, +-(a_k a_l / 4 h nu) J_k-+ J_l+-. The terms k = l shift the line by

    (a_k^2 / 2 nu) [J_k (J_k + 1) - m_k^2]          (upwards in frequency, so downwards in field)

and these add over the groups: that is the whole second-order shift. The cross terms k != l are off-diagonal:
they exchange one unit of m between two groups, with the same mixing in both electron levels, and move a line
only in third order - unless a_k and a_l differ by no more than about a_k a_l / (2 nu), when they must be
treated together. Groups of one isotope with equal couplings are therefore joined before they come here, and
`close_pairs` names those that are close without being equal.

The formula is the one of physics notes section 8; tests hold it against exact diagonalisation.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from .multiplets import projection_counts, total_spin_counts
from .splitting import Splitting, Sweep

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int16]


def first_order(splitting: Splitting, sweep: Sweep) -> tuple[FloatArray, FloatArray, IntArray]:
    """Displacements from the centre (units of the axis), shares (sum 1) and 2m, each of shape (2nI+1,)."""
    counts = projection_counts(splitting.count, splitting.twice_spin)
    top = splitting.count * splitting.twice_spin
    twice_m = np.arange(-top, top + 1, 2)
    shares = np.array([count / splitting.states for count in counts])
    gap_MHz = splitting.coupling_MHz * twice_m / 2
    return gap_MHz * sweep.axis_per_MHz, shares, twice_m.astype(np.int16)


def second_order(splitting: Splitting, sweep: Sweep) -> tuple[FloatArray, FloatArray, IntArray]:
    """As `first_order`, one entry per total spin J and m, with the second-order shift of this group."""
    gaps, shares, labels = [], [], []
    resonance_MHz = sweep.centre_mT * sweep.electron_MHz_per_mT
    coupling = splitting.coupling_MHz
    for twice_j, ways in total_spin_counts(splitting.count, splitting.twice_spin):
        twice_m = np.arange(-twice_j, twice_j + 1, 2)
        flips = (twice_j * (twice_j + 2) - twice_m**2) / 4
        gaps.append(coupling * twice_m / 2 + coupling**2 / (2 * resonance_MHz) * flips)
        shares.append(np.full(len(twice_m), ways / splitting.states))
        labels.append(twice_m)
    return (
        np.concatenate(gaps) * sweep.axis_per_MHz,
        np.concatenate(shares),
        np.concatenate(labels).astype(np.int16),
    )


def second_order_size_mT(splittings: Sequence[Splitting], sweep: Sweep) -> float:
    """a*a/(2 B0) of the largest coupling, in mT: the size of what first order leaves out."""
    largest = max((abs(splitting.coupling_MHz) for splitting in splittings), default=0.0)
    return float((largest / sweep.electron_MHz_per_mT) ** 2 / (2 * sweep.centre_mT))


def third_order_size_mT(splittings: Sequence[Splitting], sweep: Sweep) -> float:
    """Largest |a^3 m / (4 B0^2)| of a group, in mT: the size of what second order leaves out.

    The two flips from m reach levels h nu + a/2 and h nu - a/2 away, not h nu: expanding the difference gives
    this term (one nucleus: the next term of the Breit-Rabi formula, apart from the nuclear Zeeman energy).
    """
    sizes = (
        abs(s.coupling_MHz / sweep.electron_MHz_per_mT) ** 3 * s.count * s.twice_spin / 2 for s in splittings
    )
    return float(max(sizes, default=0.0) / (4 * sweep.centre_mT**2))


def close_pairs(splittings: Sequence[Splitting], sweep: Sweep) -> list[tuple[int, int]]:
    """Pairs of groups too close for second order: |a_k - a_l| < 10 a_k a_l / (2 nu), and not equal."""
    resonance_MHz = sweep.centre_mT * sweep.electron_MHz_per_mT
    found = []
    for k, one in enumerate(splittings):
        for j in range(k):
            other = splittings[j]
            reach = 10 * abs(one.coupling_MHz * other.coupling_MHz) / (2 * resonance_MHz)
            if abs(one.coupling_MHz - other.coupling_MHz) < reach:
                found.append((j, k))
    return found
