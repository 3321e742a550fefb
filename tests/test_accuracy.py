"""Fitted integrals, coarser grids and looser thresholds against exact integrals on the fine grid.

`python tests/benchmarks/accuracy.py` lists all radicals and all nuclei; here is a part of it in which every nucleus of
the list appears. The limits were set beforehand: the larger of 0.003 mT and 0.1 % for `standard`.
"""

from dataclasses import replace

import numpy as np
import pytest
from benchmarks.accuracy import couplings_mT, errors, molecule, share_of_limit
from samples import state

from unpaired.electronic import exchange, fitting, grid, threeindex
from unpaired.electronic.meanfield import mean_field
from unpaired.electronic.mole import build_mole
from unpaired.electronic.settings import SETTINGS, identity
from unpaired.level import Level
from unpaired.point import Point
from unpaired.store import Store

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


@pytest.mark.slow
@pytest.mark.parametrize("name", SOME)
def test_quick_is_within_what_the_readme_says(name):
    _, found = errors(name, "UKS", "B3LYP", ["quick"])
    assert np.abs(found["quick"]).max() < 0.01


def test_settings_differ_and_each_is_within_its_limit():
    values, found = errors("NH2", "UKS", "B3LYP", ["quick", "standard"])
    assert np.abs(found["quick"]).max() < 0.01
    assert share_of_limit(found["standard"], values).max() < 1
    assert not np.array_equal(found["quick"], found["standard"])


@pytest.mark.parametrize(("scf", "functional"), [("UHF", None), ("UKS", "B3LYP")])
def test_pairs_left_out_and_single_precision_move_no_coupling(scf, functional, monkeypatch):
    """Both converged tightly; 1e-5 mT was set beforehand, a hundredth of what fitting may move."""
    level = Level(scf, "pcH-1", functional)
    radical = molecule("CH3")
    mole = build_mole(Point(radical, level))
    tight = replace(SETTINGS["standard"], gradient_tolerance=3e-8, energy_tolerance_Eh=1e-11)
    found = []
    for near_exchange, near_potential, negligible in (
        (exchange.NEAR, grid.NEAR, threeindex.NEGLIGIBLE),
        (-1.0, -1.0, -1.0),
    ):
        monkeypatch.setattr(exchange, "NEAR", near_exchange)
        monkeypatch.setattr(grid, "NEAR", near_potential)
        monkeypatch.setattr(threeindex, "NEGLIGIBLE", negligible)
        fitting.release()
        field = mean_field(mole, level, None, tight)
        field.kernel()
        assert field.converged
        found.append(couplings_mT(radical, mole, np.asarray(field.make_rdm1())))
    fitting.release()
    np.testing.assert_allclose(found[0], found[1], rtol=0, atol=1e-5)


def test_a_state_of_one_accuracy_is_never_served_for_another(tmp_path):
    store = Store(tmp_path, identity)
    points = {name: Point(molecule("NH2"), Level("UHF", "pcH-1", accuracy=name)) for name in SETTINGS}
    for k, point in enumerate(points.values()):
        assert [store.load(later) for later in list(points.values())[k:]] == [None] * (len(points) - k)
        store.save(point, state())
    assert all(store.load(point) is not None for point in points.values())


def test_no_accuracy_has_anothers_key():
    radical = molecule("NH2")
    points = {name: Point(radical, Level("UHF", "pcH-1", accuracy=name)) for name in SETTINGS}
    keys = {point.key(identity(point.level)) for point in points.values()}
    assert len(keys) == len(SETTINGS) == 3


def test_key_changes_with_every_setting(monkeypatch):
    from dataclasses import fields

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
