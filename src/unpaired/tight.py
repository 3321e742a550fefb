"""Can a basis set describe the density at a nucleus? Judged from its s functions alone."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

LARGEST_FREE_EXPONENT = ((10, 0.08), (18, 0.02), (36, 0.01))
"""(up to this atomic number, least largest uncontracted s exponent over Z^2)."""
HYDROGEN_LARGEST_EXPONENT = 60.0
HYDROGEN_FUNCTIONS = 4


def tightness(shells: Sequence[Sequence[Any]], atomic_number: int) -> tuple[float, float]:
    """How tight the freely varying s functions of an element are, and how tight they should be.

    `shells` is [[l, [exponent, coefficient, ...], ...], ...]. For elements heavier than helium the value is
    the largest exponent that stands alone in a function, over Z^2: spin polarisation of the core needs it.
    For H and He it is the number of s functions, zero where the largest exponent misses the cusp.

    The limits separate the sets made for hyperfine couplings from those made for energies: measured against
    a nearly complete set, N atom UHF is 3 % off in pcH-1 (value 0.33) but 49 % in cc-pVDZ (0.005) and has the
    wrong sign in cc-pVTZ (0.03); H is 2 % off in pcH-1 but 16 % in cc-pVDZ and 10 % in cc-pVTZ.
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
    limit = next((share for up_to, share in LARGEST_FREE_EXPONENT if atomic_number <= up_to), 0.01)
    return largest_free / atomic_number**2, limit
