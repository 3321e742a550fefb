"""Solvents by the names that chemists write."""

from __future__ import annotations

import csv
from importlib import resources

import pytest

from unpaired.catalogue import solvent
from unpaired.errors import ChoiceError


@pytest.mark.parametrize(
    ("spellings", "dielectric"),
    [
        # CRC Handbook, from memory, 298 K; half a unit or 5 % is what sources differ by.
        (("water", "H2O", "Water"), 78.4),
        (("DMSO", "dimethyl sulfoxide", "dimethylsulfoxide", "dimethyl sulphoxide"), 46.8),
        (("liquid ammonia", "ammonia", "NH3"), 22.6),
        (("1,2-dimethoxyethane", "DME", "glyme"), 7.2),
        (("THF", "tetrahydrofuran"), 7.5),
        (("DMF", "N,N-dimethylformamide", "dimethylformamide"), 37.2),
        (("acetonitrile", "MeCN", "CH3CN"), 35.7),
        (("toluene", "PhMe"), 2.37),
        (("hexane", "n-hexane"), 1.88),
    ],
)
def test_spellings_give_one_solvent(spellings: tuple[str, ...], dielectric: float) -> None:
    found = {solvent(spelling) for spelling in spellings}
    assert len(found) == 1
    assert found.pop().dielectric == pytest.approx(dielectric, rel=0.02)


def test_every_solvent_of_pyscf_is_known_with_its_own_dielectric_constant() -> None:
    from pyscf.solvent.smd import solvent_db

    for name, row in solvent_db.items():
        if name:
            assert solvent(name).dielectric == row[5]


def test_no_two_solvents_of_our_table_share_a_spelling() -> None:
    text = resources.files("unpaired").joinpath("data/solvents.csv").read_text(encoding="utf-8")
    seen: dict[str, str] = {}
    for row in csv.DictReader(text.splitlines()):
        assert row["source"]
        assert bool(row["name_in_pyscf"]) != bool(row["dielectric"])
        for spelling in [row["name"], *filter(None, row["other_spellings"].split("; "))]:
            assert seen.setdefault(spelling.casefold(), row["name"]) == row["name"]
            assert solvent(spelling).name == row["name"]


@pytest.mark.parametrize("value", [78.4, 1, "78.4"])
def test_a_dielectric_constant_is_taken_as_it_is(value: float | str) -> None:
    assert solvent(value).dielectric == float(value)


@pytest.mark.parametrize(
    ("value", "said"),
    [
        ("watr", 'did you mean "water"?'),
        ("gas", "leave it out for the gas phase"),
        (0.5, "from 1 up"),
        (float("nan"), "from 1 up"),
        (float("inf"), "from 1 up"),
        (True, "neither a name nor a dielectric constant"),
    ],
)
def test_nonsense_is_refused(value: float | str, said: str) -> None:
    with pytest.raises(ChoiceError) as caught:
        solvent(value)
    assert said in caught.value.message
