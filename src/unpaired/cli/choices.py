"""Options that several commands read in the same way."""

from __future__ import annotations

from collections.abc import Sequence


def isotope_labels(texts: Sequence[str] | None) -> dict[str, str]:
    """`["C1=13C"]` as {"C1": "13C"}. Raises InputError for any other form."""
    from ..errors import InputError

    labels = {}
    for text in texts or []:
        atom, equals, name = text.partition("=")
        if not (atom and equals and name):
            raise InputError(f'--isotope: "{text}" is not of the form ATOM=ISOTOPE, such as C1=13C')
        labels[atom] = name
    return labels
