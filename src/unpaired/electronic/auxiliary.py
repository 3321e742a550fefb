"""The functions that densities are fitted with: a published set, made flexible near the nucleus where couplings live.

The published sets are contracted for energies. Their tightest s and p functions, which fit the products of core
and valence orbitals, come in fixed combinations; a spin density at a nucleus is a small difference of those.
Freed combinations, and for elements beyond neon a second s exponent between each two, cost a tenth more
functions; `tests/test_accuracy.py` shows what they gain.
"""

from __future__ import annotations

import itertools
from functools import cache
from typing import Any

from ..molecule import ATOMIC_NUMBER

FREED = " + free s, p"
"""Suffix of a set whose s and p functions are freed."""
NEON = 10

Shell = list[Any]


@cache
def auxiliary_basis(name: str, element: str) -> list[Shell]:
    """PySCF-format shells of a fitting set for an element; `name` is the published one, with or without `FREED`."""
    from pyscf import gto

    published: list[Shell] = gto.basis.load(name.removesuffix(FREED), element)
    if not name.endswith(FREED):
        return published
    shells = [shell for shell in published if shell[0] > 1]
    for momentum in (0, 1):
        exponents = sorted(
            {float(row[0]) for shell in published if shell[0] == momentum for row in shell[1:]}, reverse=True
        )
        if momentum == 0 and ATOMIC_NUMBER[element] > NEON:
            between = [(a * b) ** 0.5 for a, b in itertools.pairwise(exponents)]
            exponents = sorted([*exponents, *between], reverse=True)
        shells += [[momentum, [exponent, 1.0]] for exponent in exponents]
    return shells


def auxiliary_size(name: str, element: str) -> int:
    """Spherical functions of a fitting set for an element."""
    return sum((2 * shell[0] + 1) * (len(shell[1]) - 1) for shell in auxiliary_basis(name, element))
