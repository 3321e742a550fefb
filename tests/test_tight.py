"""Which basis sets are fit for the density at a nucleus."""

from __future__ import annotations

import pytest

from unpaired import catalogue
from unpaired.molecule import ATOMIC_NUMBER
from unpaired.tight import tightness


def fits(basis: str, element: str) -> bool:
    value, limit = tightness(
        catalogue.basis_for(catalogue.basis_name(basis), element), ATOMIC_NUMBER[element]
    )
    return value >= limit


@pytest.mark.parametrize(
    ("basis", "elements"),
    [
        ("pcH-1", "H C N O F Si P S Cl"),
        ("pcH-2", "H C N O F Si P S Cl"),
        ("aug-cc-pVTZ-J", "H C N O F"),
        ("IGLO-III", "C N O F"),
        ("UGBS", "H C N P"),
    ],
)
def test_sets_made_for_couplings_pass(basis: str, elements: str) -> None:
    assert [element for element in elements.split() if not fits(basis, element)] == []


@pytest.mark.parametrize(
    ("basis", "elements"),
    [
        ("STO-3G", "H C N O F"),
        ("6-31G(d)", "H C N O F P"),
        ("6-311G**", "H C N O F P"),
        ("cc-pVDZ", "H C N O F P"),
        ("cc-pVTZ", "H C N O F P"),
        ("def2-TZVP", "H C N O F P"),
        ("pcseg-2", "H C N O F P"),
        ("IGLO-II", "N"),  # 23 % below the limit for the N atom
        ("pcJ-1", "P"),  # 75 % below for the P atom
    ],
)
def test_sets_too_rigid_at_the_nucleus_do_not(basis: str, elements: str) -> None:
    assert [element for element in elements.split() if fits(basis, element)] == []
