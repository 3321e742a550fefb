"""How many ways n equivalent nuclei give a total projection m or a total spin J."""

from __future__ import annotations

import numpy as np


def projection_counts(count: int, twice_spin: int) -> list[int]:
    """Number of product states of `count` nuclei of spin I per total m, for m = -nI ... +nI in steps of 1.

    Coefficients of (1 + x + ... + x^2I)^n; for I = 1/2 the binomial numbers. Exact integers of any size.
    `twice_spin` is 2I.
    """
    single = np.ones(twice_spin + 1, dtype=object)
    counts = np.ones(1, dtype=object)
    for _ in range(count):
        counts = np.convolve(counts, single)
    return [int(value) for value in counts]


def total_spin_counts(count: int, twice_spin: int) -> list[tuple[int, int]]:
    """(2J, number of multiplets of total spin J) of `count` nuclei of spin I, largest J first.

    A multiplet of spin J has one state for each m = -J ... J, so the number with exactly J is the number of
    states with m = J less the number with m = J + 1.
    """
    counts = projection_counts(count, twice_spin)
    top = count * twice_spin
    found = []
    for place, here in enumerate(counts[: top // 2 + 1]):  # place = nI - J, by the symmetry m -> -m
        above = counts[place - 1] if place else 0
        if here > above:
            found.append((top - 2 * place, here - above))
    return found
