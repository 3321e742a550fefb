"""The isotopes of nature: what equivalent atoms may be, and how likely every combination is."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from ..nuclei import Isotope, natural_composition

MIXTURE_BELOW = 0.9
"""An element whose most abundant isotope (spinless ones together) falls below this share is a mixture by
default: B, Cl, Br among the common ones."""
SMALLEST_SHARE = 1e-4
"""Combinations of default mixtures below this share are left out."""

Filling = tuple[tuple[Isotope | None, int], ...]
"""How many of a number of equivalent atoms are of which isotope; None stands for the spinless ones."""


def is_usual(kind: Isotope | None, element: str) -> bool:
    """Whether nearly all atoms of the element are of this kind, so that it need not be named."""
    commonest, share = natural_composition(element)[0]
    return kind == commonest and share >= MIXTURE_BELOW


def fillings(element: str, count: int, least_share: float | None) -> list[tuple[float, Filling]]:
    """What `count` equivalent atoms may be, with shares, most abundant first.

    Down to `least_share`; for None the main isotope only, unless the element is a mixture by default.
    """
    if not count:
        return [(1.0, ())]
    composition = natural_composition(element)
    if least_share is None and composition[0][1] >= MIXTURE_BELOW:
        return [(1.0, ((composition[0][0], count),))]
    everything = sorted(_multinomial(composition, count), key=lambda pair: -pair[0])
    limit = least_share or SMALLEST_SHARE
    return [pair for pair in everything if pair[0] >= limit] or everything[:1]


def combinations(
    choices: Sequence[Sequence[tuple[float, Filling]]], least_share: float | None
) -> list[tuple[float, tuple[Filling, ...]]]:
    """One filling per site, most abundant first; the most abundant one stays even below `least_share`.

    A product of shares only falls, so whatever is below the limit on the way is dropped.
    """
    limit = least_share or SMALLEST_SHARE
    found: list[tuple[float, tuple[Filling, ...]]] = [(1.0, ())]
    for options in choices:
        wider = [(share * more, (*before, filling)) for share, before in found for more, filling in options]
        wider.sort(key=lambda pair: -pair[0])
        found = [pair for pair in wider if pair[0] >= limit] or wider[:1]
    return found


def _multinomial(
    composition: Sequence[tuple[Isotope | None, float]], count: int
) -> Iterator[tuple[float, Filling]]:
    """Every way to fill `count` equivalent places, with its probability."""
    (kind, share), *others = composition
    if not others:
        yield share**count, ((kind, count),) if count else ()
        return
    for number in range(count + 1):
        here = math.comb(count, number) * share**number
        for rest_share, rest in _multinomial(others, count - number):
            yield here * rest_share, (((kind, number), *rest) if number else rest)
