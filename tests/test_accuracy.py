"""Fitted integrals, coarser grids and looser thresholds against exact integrals on the fine grid.

`python tests/benchmarks/accuracy.py` lists all radicals and all nuclei; here is a part of it in which every nucleus of
the list appears. The limits were set beforehand: the larger of 0.003 mT and 0.1 % for `standard`.
"""

import numpy as np
import pytest
from benchmarks.accuracy import errors, molecule, share_of_limit

from unpaired.electronic.settings import SETTINGS, identity
from unpaired.level import Level
from unpaired.point import Point

SOME = ["F2-", "P", "NH2", "BF2", "HSO", "SiH3", "CHCl2"]


def test_the_radicals_have_every_nucleus_asked_for():
    found = {element for name in SOME for element in molecule(name).elements}
    assert found == {"H", "B", "C", "N", "O", "F", "Si", "P", "S", "Cl"}


@pytest.mark.slow
@pytest.mark.parametrize("name", SOME)
@pytest.mark.parametrize(("scf", "functional"), [("UHF", None), ("UKS", "B3LYP")])
def test_standard_is_within_its_limit(name, scf, functional):
    values, found = errors(name, scf, functional, ["standard"])
    assert share_of_limit(found["standard"], values).max() < 1


def test_quick_is_within_its_limit_and_differs_from_standard():
    values, found = errors("NH2", "UKS", "B3LYP", ["quick", "standard"])
    assert np.all(np.abs(found["quick"]) < np.maximum(0.02, 0.005 * np.abs(values)))
    assert not np.array_equal(found["quick"], found["standard"])


def test_no_accuracy_is_served_anothers_state():
    radical = molecule("NH2")
    points = {name: Point(radical, Level("UHF", "pcH-1", accuracy=name)) for name in SETTINGS}
    keys = {point.key(identity(point.level)) for point in points.values()}
    assert len(keys) == len(SETTINGS) == 3


def test_key_changes_with_every_setting(monkeypatch):
    from dataclasses import fields, replace

    level = Level("UKS", "pcH-1", "B3LYP")
    point = Point(molecule("NH2"), level)
    before = SETTINGS["standard"]
    keys = {point.key(identity(level))}
    for field in fields(before):
        value = getattr(before, field.name)
        other = value + "x" if isinstance(value, str) else value * 2 + 1
        monkeypatch.setitem(SETTINGS, "standard", replace(before, **{field.name: other}))
        keys.add(point.key(identity(level)))
    assert len(keys) == 1 + len(fields(before))
