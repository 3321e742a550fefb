"""Exact line positions of S = 1/2 and groups of nuclei, by diagonalisation, at a fixed frequency or field.

    H/h = g mu_B B S_z + sum_k [ a_k S.J_k - g_Nk mu_N B J_kz ]

with the total spins J_k of the groups, so that 2^N states never appear. H conserves M = m_S + sum m_k: it
falls into one real symmetric block per M, and the transitions that S_x allows join blocks M and M + 1.

At a fixed frequency every resonance field is a root of E_j(B) - E_i(B) = nu. Levels and their slopes
dE/dB = <dH/dB> are computed at the ends of a field interval and joined by the Hermite cubic; where the cubic
misses the diagonalisation at the midpoint by more than `TOLERANCE_MHz` the interval is halved, so avoided
crossings are resolved as finely as they need. The line's area in a field sweep is |<j|S+|i>|^2 / (d nu/d B).
For one nucleus this reproduces the Breit-Rabi formula (test).
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise, product

import numpy as np
from numpy.typing import NDArray

from .multiplets import total_spin_counts
from .splitting import Splitting, Sweep

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int16]
Found = tuple[FloatArray, FloatArray, IntArray]

TOLERANCE_MHz = 1e-6
"""Misfit of the cubic at a midpoint; the halves that are then used are about 16 times better (2e-9 mT)."""
SMALLEST_INTERVAL_mT = 1e-6
WEAKEST = 1e-5
"""Transitions weaker than this share of a full one are left out."""


@dataclass(frozen=True, eq=False)
class Blocks:
    """H = hyperfine + B * zeeman in blocks of M, for one choice of the total spins J_k."""

    hyperfine_MHz: tuple[FloatArray, ...]
    """One (n, n) matrix per M, ascending."""
    zeeman_MHz_per_mT: tuple[FloatArray, ...]
    """Diagonals (n,)."""
    raised: tuple[tuple[NDArray[np.intp], NDArray[np.intp]], ...]
    """Per pair of neighbouring blocks: places of |-1/2, m> in the lower and of |+1/2, m> in the upper one."""
    twice_m: tuple[IntArray, ...]
    """Per pair of neighbouring blocks: 2m_k of those states, shape (states, groups)."""


@dataclass(frozen=True, eq=False)
class Levels:
    """Eigenvalues, their field derivatives and vectors of every block at one field."""

    field_mT: float
    energy_MHz: tuple[FloatArray, ...]
    slope_MHz_per_mT: tuple[FloatArray, ...]
    vectors: tuple[FloatArray, ...]
    strength: tuple[FloatArray, ...]
    """Per pair of neighbouring blocks |<j|S+|i>|^2, shape (lower, upper)."""


def exact_lines(splittings: Sequence[Splitting], sweep: Sweep) -> Found:
    """Positions (units of the axis), shares (sum 1) and 2m per group of every allowed line.

    2m of a line is that of its largest component. Positions are good to about 1e-8 mT.
    """
    positions, weights, labels = [], [], []
    multiplets = [total_spin_counts(s.count, s.twice_spin) for s in splittings]
    for choice in product(*multiplets):
        ways = np.prod([float(count) for _, count in choice]) if choice else 1.0
        twice_js = [twice_j for twice_j, _ in choice]
        here = _lines_of(splittings, twice_js, sweep)
        positions.append(here[0])
        weights.append(here[1] * ways)
        labels.append(here[2])
    weight = np.concatenate(weights)
    return np.concatenate(positions), weight / weight.sum(), np.concatenate(labels)


def blocks(splittings: Sequence[Splitting], twice_js: Sequence[int], electron_MHz_per_mT: float) -> Blocks:
    """The Hamiltonian for groups with total spins J_k (`twice_js` is 2J_k)."""
    ladders = [range(-twice_j, twice_j + 1, 2) for twice_j in twice_js]
    states: dict[int, list[tuple[int, ...]]] = {}
    for state in product((-1, 1), *ladders):
        states.setdefault(sum(state), []).append(state)
    totals = sorted(states)
    place = {state: row for total in totals for row, state in enumerate(states[total])}
    slopes = [electron_MHz_per_mT, *(-s.nuclear_MHz_per_mT for s in splittings)]
    matrices, zeeman, raised, twice_m = [], [], [], []
    for total in totals:
        here = states[total]
        matrix = np.zeros((len(here), len(here)))
        for row, state in enumerate(here):
            spin, *nuclei = state
            for k, (splitting, twice_j) in enumerate(zip(splittings, twice_js, strict=True)):
                a, m = splitting.coupling_MHz, nuclei[k]
                matrix[row, row] += a * spin * m / 4
                if spin < 0 and m > -twice_j:  # S+ J-: |-, m> to |+, m - 1>
                    partner = [1, *nuclei]
                    partner[k + 1] = m - 2
                    column = place[tuple(partner)]
                    flip = a / 4 * np.sqrt(twice_j * (twice_j + 2) - m * (m - 2))
                    matrix[row, column] = matrix[column, row] = flip
        matrices.append(matrix)
        zeeman.append(
            np.array([sum(s * m / 2 for s, m in zip(slopes, state, strict=True)) for state in here])
        )
        lower = [row for row, state in enumerate(here) if state[0] < 0]
        if total + 2 in states:
            raised.append(
                (
                    np.array(lower, dtype=np.intp),
                    np.array([place[(1, *here[r][1:])] for r in lower], dtype=np.intp),
                )
            )
            twice_m.append(
                np.array([here[r][1:] for r in lower], dtype=np.int16).reshape(len(lower), len(twice_js))
            )
    return Blocks(tuple(matrices), tuple(zeeman), tuple(raised), tuple(twice_m))


def solve_at(parts: Blocks, field_mT: float) -> Levels:
    """Diagonalise every block at one field."""
    energy, slope, vectors = [], [], []
    for matrix, zeeman in zip(parts.hyperfine_MHz, parts.zeeman_MHz_per_mT, strict=True):
        values, columns = np.linalg.eigh(matrix + np.diag(field_mT * zeeman))
        energy.append(values)
        slope.append(zeeman @ columns**2)
        vectors.append(columns)
    strength = [
        (lower[source].T @ upper[target]) ** 2
        for (lower, upper), (source, target) in zip(pairwise(vectors), parts.raised, strict=True)
    ]
    return Levels(field_mT, tuple(energy), tuple(slope), tuple(vectors), tuple(strength))


def _lines_of(splittings: Sequence[Splitting], twice_js: Sequence[int], sweep: Sweep) -> Found:
    parts = blocks(splittings, twice_js, sweep.electron_MHz_per_mT)
    # Hyperfine terms move a level by at most their norm, |a|(J+1)/2 each, hence a line by twice that.
    reach_MHz = sum(abs(s.coupling_MHz) * (j / 2 + 1) for s, j in zip(splittings, twice_js, strict=True))
    reach_mT = 1.05 * reach_MHz / sweep.electron_MHz_per_mT + 0.01 * sweep.centre_mT
    if sweep.field_mT is not None:
        return _at_fixed_field(parts, sweep, reach_mT * sweep.electron_MHz_per_mT)
    first = max(sweep.centre_mT - reach_mT, 0.0)
    last = sweep.centre_mT + reach_mT
    assert sweep.frequency_MHz is not None
    nu = sweep.frequency_MHz
    results = [_roots(parts, *nodes, nu) for nodes in _segments(lambda b: solve_at(parts, b), first, last)]
    return _joined(results, len(splittings))


def _joined(results: Sequence[Found], groups: int) -> Found:
    if not results:
        return np.empty(0), np.empty(0), np.empty((0, groups), dtype=np.int16)
    positions, weights, labels = zip(*results, strict=True)
    return np.concatenate(positions), np.concatenate(weights), np.concatenate(labels)


def _segments(
    solve: Callable[[float], Levels], first_mT: float, last_mT: float
) -> Iterator[tuple[Levels, Levels, Levels]]:
    """(lower end, midpoint, upper end) of intervals on which the cubic is good enough."""
    stack = [(solve(first_mT), solve(last_mT))]
    while stack:
        low, high = stack.pop()
        middle = _followed(low, solve((low.field_mT + high.field_mT) / 2))
        high = _followed(middle, high)
        width = high.field_mT - low.field_mT
        misfit = max(
            float(np.abs((e0 + e1) / 2 + width * (s0 - s1) / 8 - e).max())
            for e0, e1, s0, s1, e in zip(
                low.energy_MHz,
                high.energy_MHz,
                low.slope_MHz_per_mT,
                high.slope_MHz_per_mT,
                middle.energy_MHz,
                strict=True,
            )
        )
        if misfit > TOLERANCE_MHz and width > SMALLEST_INTERVAL_mT:
            stack += [(low, middle), (middle, high)]
        else:
            yield low, middle, high


def _followed(known: Levels, other: Levels) -> Levels:
    """`other` with its levels in the order of `known`, by overlap of their vectors.

    Levels that cross, or nearly, are followed through the crossing. A block where no clear order exists (a
    vector is spread over several) stays sorted by energy; the cubic then tells whether that is good enough.
    """
    orders = []
    for old, new in zip(known.vectors, other.vectors, strict=True):
        overlap = (old.T @ new) ** 2
        order = overlap.argmax(axis=1)
        clear = (
            overlap[np.arange(len(order)), order].min() > 0.5
        )  # then no two old levels claim one new level
        orders.append(order if clear else np.arange(len(order)))
    return Levels(
        other.field_mT,
        tuple(values[order] for values, order in zip(other.energy_MHz, orders, strict=True)),
        tuple(values[order] for values, order in zip(other.slope_MHz_per_mT, orders, strict=True)),
        tuple(columns[:, order] for columns, order in zip(other.vectors, orders, strict=True)),
        tuple(
            strength[np.ix_(lower, upper)]
            for strength, (lower, upper) in zip(other.strength, pairwise(orders), strict=True)
        ),
    )


def _roots(parts: Blocks, low: Levels, middle: Levels, high: Levels, frequency_MHz: float) -> Found:
    """Every resonance between the ends of an accepted interval."""
    results = []
    for left, right in ((low, middle), (middle, high)):
        for lower in range(len(parts.raised)):
            strongest = np.maximum(left.strength[lower], right.strength[lower])
            gap0, gap1 = (_difference(x.energy_MHz, lower) - frequency_MHz for x in (left, right))
            i, j = np.nonzero(((gap0 < 0) != (gap1 < 0)) & (strongest > WEAKEST))
            if not len(i):
                continue
            width = right.field_mT - left.field_mT
            ends = (gap0[i, j], gap1[i, j])
            slopes = tuple(_difference(x.slope_MHz_per_mT, lower)[i, j] for x in (left, right))
            t, slope = _cubic_root(ends, (slopes[0] * width, slopes[1] * width))
            field = left.field_mT + t * width
            x = (field - low.field_mT) / (high.field_mT - low.field_mT)
            strength = (
                low.strength[lower][i, j] * (2 * x - 1) * (x - 1)
                + middle.strength[lower][i, j] * 4 * x * (1 - x)
                + high.strength[lower][i, j] * x * (2 * x - 1)
            )
            weight = np.maximum(strength, 0.0) * width / np.abs(slope)
            results.append((field, weight, _labels(parts, middle, lower, i, j)))
    return _joined(results, parts.twice_m[0].shape[1])


def _at_fixed_field(parts: Blocks, sweep: Sweep, reach_MHz: float) -> Found:
    """Every transition within reach of the electron's own frequency; those of the nuclei lie far below."""
    levels = solve_at(parts, sweep.centre_mT)
    results = []
    for lower in range(len(parts.raised)):
        gap = _difference(levels.energy_MHz, lower)
        i, j = np.nonzero((levels.strength[lower] > WEAKEST) & (np.abs(gap - sweep.centre) < reach_MHz))
        results.append((gap[i, j], levels.strength[lower][i, j], _labels(parts, levels, lower, i, j)))
    return _joined(results, parts.twice_m[0].shape[1])


def _difference(values: tuple[FloatArray, ...], lower: int) -> FloatArray:
    return values[lower + 1][None, :] - values[lower][:, None]


def _labels(parts: Blocks, levels: Levels, lower: int, i: NDArray[np.intp], j: NDArray[np.intp]) -> IntArray:
    """2m of the largest common component of lower states i and upper states j."""
    source, target = parts.raised[lower]
    common = np.abs(levels.vectors[lower][source][:, i] * levels.vectors[lower + 1][target][:, j])
    labels: IntArray = parts.twice_m[lower][common.argmax(axis=0)]
    return labels


def _cubic_root(
    ends: tuple[FloatArray, FloatArray], slopes: tuple[FloatArray, ...]
) -> tuple[FloatArray, FloatArray]:
    """Root in [0, 1] of the Hermite cubics with these end values and slopes, and the slope there.

    Newton steps, replaced by bisection where they leave the bracket. All arrays of shape (lines,).
    """
    f0, f1 = ends
    d0, d1 = slopes
    c2 = 3 * (f1 - f0) - 2 * d0 - d1
    c3 = 2 * (f0 - f1) + d0 + d1
    low, high = np.zeros_like(f0), np.ones_like(f0)
    t = np.clip(f0 / (f0 - f1), 0.0, 1.0)
    for _ in range(60):
        value = ((c3 * t + c2) * t + d0) * t + f0
        slope = (3 * c3 * t + 2 * c2) * t + d0
        same_side = (value < 0) == (f0 < 0)
        low, high = np.where(same_side, t, low), np.where(same_side, high, t)
        with np.errstate(divide="ignore", invalid="ignore"):
            step = t - value / slope
        inside = (step >= low) & (step <= high)
        t = np.where(inside, step, (low + high) / 2)
    return t, (3 * c3 * t + 2 * c2) * t + d0
