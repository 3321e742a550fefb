"""Multiplicities of groups of equivalent nuclei against brute-force enumeration."""

from __future__ import annotations

from collections import Counter
from itertools import product

import pytest

from unpaired.spectrum.multiplets import projection_counts, total_spin_counts

CASES = [(count, twice_spin) for count in range(7) for twice_spin in (1, 2, 3)]


@pytest.mark.parametrize(("count", "twice_spin"), CASES)
def test_projections_are_those_of_all_product_states(count: int, twice_spin: int) -> None:
    ladder = range(-twice_spin, twice_spin + 1, 2)
    brute = Counter(sum(state) for state in product(ladder, repeat=count))
    assert projection_counts(count, twice_spin) == [brute[m] for m in sorted(brute)]


@pytest.mark.parametrize(("count", "twice_spin"), CASES)
def test_total_spins_are_those_of_coupling_one_nucleus_after_another(count: int, twice_spin: int) -> None:
    brute = Counter({0: 1})
    for _ in range(count):  # J and I couple to |J - I| ... J + I
        brute = sum(
            (
                Counter({total: ways})
                for twice_j, ways in brute.items()
                for total in range(abs(twice_j - twice_spin), twice_j + twice_spin + 1, 2)
            ),
            Counter(),
        )
    assert total_spin_counts(count, twice_spin) == sorted(brute.items(), reverse=True)


def test_five_protons_have_the_binomial_numbers() -> None:
    assert projection_counts(5, 1) == [1, 5, 10, 10, 5, 1]


def test_large_groups_are_counted_exactly() -> None:
    assert sum(projection_counts(200, 1)) == 2**200
