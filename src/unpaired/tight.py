"""Can a basis set describe the density at a nucleus? Judged from its s functions alone."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

LARGEST_FREE_EXPONENT = ((10, 0.2), (18, 0.08), (36, 0.03))
"""(up to this atomic number, least largest uncontracted s exponent over Z^2)."""
HYDROGEN_LARGEST_EXPONENT = 500.0
HYDROGEN_FUNCTIONS = 4


def tightness(shells: Sequence[Sequence[Any]], atomic_number: int) -> tuple[float, float]:
    """How tight the freely varying s functions of an element are, and how tight they should be.

    `shells` is [[l, [exponent, coefficient, ...], ...], ...]. For elements heavier than helium the value is
    the largest exponent that stands alone in a function, over Z^2: spin polarisation of the core needs it.
    For H and He it is the number of s functions, zero where the largest exponent misses the cusp.

    The limits separate what errs by little from what errs by much against a nearly complete set (UHF, computed
    with this program): N atom pcH-1 -3 % (value 0.33), pcJ-1 -7 % (0.10), IGLO-II -23 % (0.15), cc-pVDZ 49 %
    (0.005), cc-pVTZ the wrong sign (0.03); P atom pcH-1 is the smallest set that passes (0.09), pcJ-1 -75 %
    (0.02), cc-pCVTZ 49 % (0.05); H atom pcH-1 -2 %, IGLO-III -7 %, cc-pVQZ -6 %, cc-pVDZ -16 %. def2-QZVP at N
    (0.145, -4 %) is a false alarm that we accept; IGLO-III at P (-29 %) is a miss that we know.
    """
    functions, largest, largest_free = 0, 0.0, 0.0
    for shell in shells:
        if shell[0] != 0:
            continue
        primitives = [row for row in shell[1:] if isinstance(row, list | tuple)]
        largest = max([largest, *(row[0] for row in primitives)])
        for column in range(1, len(primitives[0])):
            functions += 1
            members = [row[0] for row in primitives if abs(row[column]) > 1e-8]
            if len(members) == 1:
                largest_free = max(largest_free, members[0])
    if atomic_number <= 2:
        return (float(functions) if largest >= HYDROGEN_LARGEST_EXPONENT else 0.0), float(HYDROGEN_FUNCTIONS)
    limit = next((share for up_to, share in LARGEST_FREE_EXPONENT if atomic_number <= up_to), 0.03)
    return largest_free / atomic_number**2, limit
