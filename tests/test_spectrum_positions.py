"""Exact, second-order and first-order line positions against formulas and against each other."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import brentq
from spin_samples import splitting

from unpaired.constants import BOHR_MAGNETON_MHZ_T, ELECTRON_G, NUCLEAR_MAGNETON_MHZ_T
from unpaired.spectrum.exact import exact_lines
from unpaired.spectrum.orders import (
    close_pairs,
    first_order,
    second_order,
    second_order_size_mT,
    third_order_size_mT,
)
from unpaired.spectrum.splitting import Splitting, Sweep

X_BAND = Sweep(ELECTRON_G, frequency_MHz=9500.0)
METHYL_MHz = -2.304 * 28.0249514


def in_order(values: np.ndarray) -> list[float]:
    return np.sort(values).tolist()


def test_hydrogen_atom_lines() -> None:
    # Physics notes section 2 (Breit-Rabi, computed there and checked against direct diagonalisation).
    position, _, _ = exact_lines([splitting("1H", 1, 1420.40575)], X_BAND)
    assert in_order(position) == pytest.approx([311.59734, 362.56538], abs=1e-5)


def test_nitrogen_lines() -> None:
    # Same source.
    position, _, _ = exact_lines([splitting("14N", 1, 45.0)], X_BAND)
    assert in_order(position) == pytest.approx([337.37412, 338.97603, 340.58556], abs=1e-5)


def breit_rabi(one: Splitting, m: float, upper: bool, field_mT: float) -> float:
    """Level in MHz; physics notes section 8, with the nuclear terms of H = a S.I + g mu_B B S_z - g_N mu_N B I_z."""
    spin, a = one.twice_spin / 2, one.coupling_MHz
    nuclear = one.nuclear_g * NUCLEAR_MAGNETON_MHZ_T * field_mT * 1e-3
    x = ELECTRON_G * BOHR_MAGNETON_MHZ_T * field_mT * 1e-3 + nuclear
    root = math.sqrt(x * x + 2 * x * a * m + a * a * (spin + 0.5) ** 2)
    return -a / 4 - nuclear * m + (root if upper else -root) / 2


@pytest.mark.parametrize("name", ["1H", "2H", "13C", "14N", "15N", "17O", "35Cl"])
@pytest.mark.parametrize("coupling_MHz", [-1300.0, -40.0, 3.0, 400.0])
def test_one_nucleus_obeys_the_breit_rabi_formula(name: str, coupling_MHz: float) -> None:
    one = splitting(name, 1, coupling_MHz)
    position, _, twice_m = exact_lines([one], X_BAND)
    # The line |-, m_I> to |+, m_I> joins levels of total M = m_I - 1/2 (lower) and m_I + 1/2 (upper); at the two
    # outermost M there is one level only, linear in B.
    expected = []
    for twice in range(-one.twice_spin, one.twice_spin + 1, 2):
        m = twice / 2

        def gap(field_mT: float, m: float = m) -> float:
            spin = one.twice_spin / 2
            low = breit_rabi(one, m - 0.5, False, field_mT)
            high = breit_rabi(one, m + 0.5, True, field_mT)
            nuclear = one.nuclear_g * NUCLEAR_MAGNETON_MHZ_T * field_mT * 1e-3
            zeeman = ELECTRON_G * BOHR_MAGNETON_MHZ_T * field_mT * 1e-3
            if m == -spin:
                low = -zeeman / 2 + one.coupling_MHz * spin / 2 + nuclear * spin
            if m == spin:
                high = zeeman / 2 + one.coupling_MHz * spin / 2 - nuclear * spin
            return high - low - 9500.0

        expected.append(brentq(gap, 200.0, 500.0, xtol=1e-12))
    strongest = np.argsort(twice_m[:, 0])
    assert position[strongest] == pytest.approx(expected, abs=1e-7)


def test_inner_methyl_lines_split() -> None:
    # Second-order structure, 0.0235 mT, intensities 1:2 (physics notes section 2; coupling: Fessenden and Schuler,
    # J. Chem. Phys. 39, 2147 (1963), from memory)
    for position, share in (
        exact_lines([splitting("1H", 3, METHYL_MHz)], X_BAND)[:2],
        second_order(splitting("1H", 3, METHYL_MHz), X_BAND)[:2],
    ):
        sorting = np.argsort(position)
        gaps = np.diff(position[sorting])
        assert gaps[[1, 3]] == pytest.approx([0.0235, 0.0235], abs=5e-5)
        assert share[sorting] * 8 == pytest.approx([1, 1, 2, 1, 2, 1], abs=1e-5)


GROUPS = [splitting("1H", 3, METHYL_MHz), splitting("13C", 1, 107.4), splitting("14N", 2, 20.0)]


@pytest.mark.parametrize("sweep", [X_BAND, Sweep(ELECTRON_G, field_mT=340.0)], ids=["field", "frequency"])
def test_second_order_of_several_groups_misses_the_exact_lines_by_third_order_only(sweep: Sweep) -> None:
    exact, weight, labels = exact_lines(GROUPS, sweep)
    near = np.array([sweep.centre])
    for group in GROUPS:
        near = np.add.outer(near, second_order(group, sweep)[0]).ravel()
    assert len(exact) == len(near)
    # One more power of a/B0 than the largest second-order shift, J(J+1) <= 6 for these groups.
    tolerance = 6 * second_order_size_mT(GROUPS, sweep) * (107.4 / 9500) * sweep.axis_per_mT * len(GROUPS)
    assert in_order(exact) == pytest.approx(in_order(near), abs=tolerance)
    assert tolerance < 0.005 * sweep.axis_per_mT
    assert weight.sum() == pytest.approx(1.0, abs=1e-12)
    assert set(map(tuple, labels.tolist())) == {
        (a, b, c) for a in (-3, -1, 1, 3) for b in (-1, 1) for c in (-4, -2, 0, 2, 4)
    }


def test_second_order_misses_one_nucleus_by_the_third_order_term() -> None:
    one = splitting("13C", 1, 600.0)
    exact, _, labels = exact_lines([one], X_BAND)
    near = X_BAND.centre + second_order(one, X_BAND)[0]
    missed = np.abs(exact[np.argsort(labels[:, 0])] - near)
    # m = 1/2; the rest is the nuclear Zeeman energy, a sixth of a/2 here, and the next order, a/B0 of it.
    assert missed == pytest.approx([third_order_size_mT([one], X_BAND)] * 2, rel=0.25)


def test_orders_agree_for_a_vanishing_coupling() -> None:
    small = splitting("1H", 2, 1e-3)
    first = np.repeat(first_order(small, X_BAND)[0], [1, 2, 1])
    assert in_order(second_order(small, X_BAND)[0]) == pytest.approx(in_order(first), abs=1e-9)


def test_a_group_is_the_same_as_its_nuclei_one_by_one() -> None:
    together, share, _ = exact_lines([splitting("1H", 3, METHYL_MHz)], X_BAND)
    apart, weight, _ = exact_lines(
        [splitting("1H", 1, METHYL_MHz + shift) for shift in (0.0, 1e-5, -1e-5)], X_BAND
    )
    for position, expected in zip(together, share, strict=True):
        assert weight[np.abs(apart - position) < 1e-5].sum() == pytest.approx(expected, abs=1e-5)


def test_field_and_frequency_sweeps_meet() -> None:
    field, _, _ = exact_lines(GROUPS, X_BAND)
    frequency, _, _ = exact_lines(GROUPS, Sweep(ELECTRON_G, field_mT=float(field.max())))
    assert np.abs(frequency - 9500.0).min() < 1e-6


def test_no_couplings_give_one_line_at_the_centre() -> None:
    position, share, labels = exact_lines([], X_BAND)
    assert position == pytest.approx([X_BAND.centre], abs=1e-9)
    assert share.tolist() == [1.0]
    assert labels.shape == (1, 0)


def test_ten_different_protons_cross_many_levels_and_still_give_every_line() -> None:
    couplings = np.array([-57.0, -43.0, -23.0, -11.0, -9.0, 1.5, 6.0, 39.0, 50.0, 54.0])
    position, weight, labels = exact_lines([splitting("1H", 1, float(a)) for a in couplings], X_BAND)
    strong = weight > 0.5 / 1024
    assert strong.sum() == 1024
    assert len(set(map(tuple, labels[strong].tolist()))) == 1024
    first = X_BAND.centre - labels[strong] / 2 @ couplings / X_BAND.electron_MHz_per_mT
    # Second order moves every line by sum a^2/(2 B0) [3/4 - 1/4]; a tenth of that is left for the higher orders.
    shift = (couplings**2).sum() / X_BAND.electron_MHz_per_mT**2 / (2 * X_BAND.centre) / 2
    assert position[strong] - first == pytest.approx(-shift, abs=shift / 10)


def test_couplings_that_second_order_mixes_are_named() -> None:
    groups = [splitting("1H", 2, 50.0), splitting("1H", 1, 51.0), splitting("1H", 1, 90.0)]
    assert close_pairs(groups, X_BAND) == [(0, 1)]
