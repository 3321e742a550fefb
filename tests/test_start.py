"""The starting density: a legal density, near the answer."""

from dataclasses import replace

import numpy as np
import pytest

from unpaired import catalogue
from unpaired.electronic import start
from unpaired.electronic.meanfield import mean_field
from unpaired.electronic.mole import build_mole
from unpaired.electronic.settings import settings
from unpaired.errors import ChoiceError
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point, Solvent

FORMYL = Molecule(("C", "O", "H"), np.array([[0, 0, 0], [0, 0, 2.22], [1.77, 0, -1.12]]), 0, 2)


@pytest.mark.parametrize("level", [Level("UHF", "pcH-1"), Level("ROKS", "pcH-1", "B3LYP")])
def test_start_is_idempotent_and_has_all_electrons(level):
    point = Point(FORMYL, level)
    mole = build_mole(point)
    overlap = mole.intor("int1e_ovlp")
    for density, electrons in zip(
        start.initial_density(point, mole, settings(level)), mole.nelec, strict=True
    ):
        assert np.sum(density * overlap) == pytest.approx(electrons, abs=1e-8)
        np.testing.assert_allclose(density @ overlap @ density, density, atol=1e-8)


def test_start_saves_iterations_and_ends_in_the_same_state():
    level = Level("UKS", "pcH-1", "B3LYP")
    point = Point(FORMYL, level)
    mole = build_mole(point)
    ends, counts = [], []
    for density in (None, start.initial_density(point, mole, settings(level))):
        seen = []
        field = mean_field(mole, level, None, settings(level))
        field.callback = lambda local, seen=seen: seen.append(local["e_tot"])
        ends.append(field.kernel(dm0=density))
        counts.append(len(seen))
    assert ends[1] == pytest.approx(ends[0], abs=1e-8)
    assert counts[1] < counts[0]


def test_basis_without_a_small_one_starts_all_the_same(monkeypatch):
    def refuse(*_):
        raise ChoiceError("no such element")

    monkeypatch.setattr(catalogue, "check_basis", refuse)
    level = Level("UHF", "pcH-1")
    point = Point(FORMYL, level)
    mole = build_mole(point)
    density = start.initial_density(point, mole, settings(level))
    expected = mean_field(mole, level, None, settings(level)).get_init_guess()
    np.testing.assert_array_equal(density, expected)


def test_projection_into_the_same_basis_changes_nothing():
    level = Level("UHF", "pcseg-0")
    point = Point(FORMYL, level)
    mole = build_mole(point)
    field = mean_field(mole, level, None, settings(level))
    field.kernel()
    density = np.asarray(field.make_rdm1())
    np.testing.assert_allclose(start.project(mole, mole, density, mole.nelec), density, atol=1e-8)


def test_coarse_stage_changes_no_result():
    """The coarse grid is a detour on the way: energies agree to the threshold of the level."""
    level = Level("UKS", "pcseg-1", "B3LYP")
    mole = build_mole(Point(FORMYL, level))
    direct = mean_field(mole, level, None, replace(settings(level), start_grid_level=None)).run()
    staged = mean_field(mole, level, None, settings(level)).run()
    assert direct.converged
    assert staged.converged
    assert staged.e_tot == pytest.approx(direct.e_tot, abs=1e-8)
    assert staged.grids.level == settings(level).grid_level


def test_staged_field_goes_through_second_order_gradients_and_continuum():
    level = Level("UKS", "pcseg-0", "B3LYP")
    mole = build_mole(Point(FORMYL, level))
    field = mean_field(mole, level, Solvent("water", 78.4), settings(level)).run()
    second = field.newton().run()
    assert second.converged
    assert second.e_tot == pytest.approx(field.e_tot, abs=1e-7)
    gradient = field.nuc_grad_method().run().de
    np.testing.assert_allclose(gradient.sum(axis=0), 0, atol=3e-3)  # a coarse grid does not quite keep this
