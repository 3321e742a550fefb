"""Combinations of natural isotopes against enumeration atom by atom."""

from __future__ import annotations

from collections import Counter
from itertools import product

import pytest

from unpaired.nuclei import natural_composition
from unpaired.spectrum.natural import combinations, fillings, is_usual


@pytest.mark.parametrize(("element", "count"), [("C", 4), ("Cl", 3), ("O", 2), ("Ti", 3)])
def test_shares_are_those_of_all_ways_to_fill_the_places(element: str, count: int) -> None:
    brute: Counter[frozenset[tuple[object, int]]] = Counter()
    for places in product(natural_composition(element), repeat=count):
        share = 1.0
        for _, one in places:
            share *= one
        brute[frozenset(Counter(kind for kind, _ in places).items())] += share  # type: ignore[assignment]
    found = {frozenset(filling): share for share, filling in fillings(element, count, 1e-30)}
    assert found == pytest.approx(dict(brute))
    assert sum(found.values()) == pytest.approx(1.0)


def test_combinations_multiply_and_come_most_abundant_first() -> None:
    carbon, chlorine = fillings("C", 2, 1e-3), fillings("Cl", 1, 1e-3)
    found = combinations([carbon, chlorine], 1e-3)
    expected = sorted((a * b for a, _ in carbon for b, _ in chlorine if a * b >= 1e-3), reverse=True)
    assert [share for share, _ in found] == pytest.approx(expected)


def test_usual_isotopes_need_no_name() -> None:
    assert is_usual(None, "C")
    assert not is_usual(natural_composition("Cl")[0][0], "Cl")
