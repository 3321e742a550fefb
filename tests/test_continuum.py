"""The continuum against the library's own, which computes everything anew in every iteration."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from unpaired.electronic import continuum
from unpaired.electronic.meanfield import mean_field
from unpaired.electronic.mole import build_mole
from unpaired.electronic.settings import settings
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point, Solvent

LEVEL = Level("UHF", "pcseg-0")
WATER = Solvent("water", 78.36)
FORMYL = Molecule(
    ("C", "O", "H"),
    np.array([[0.0, 0.0, 0.0], [2.22, 0.0, 0.0], [-1.2, 1.72, 0.0]]),
    charge=0,
    multiplicity=2,
)


def field_in_water(library: bool) -> Any:
    """Converged UHF of HCO in water; `library` takes PySCF's own continuum."""
    mole = build_mole(Point(FORMYL, LEVEL))
    if not library:
        field = mean_field(mole, LEVEL, WATER, settings(LEVEL))
    else:
        field = mean_field(mole, LEVEL, None, settings(LEVEL)).PCM()
        field.with_solvent.method, field.with_solvent.eps = "IEF-PCM", WATER.dielectric
    field.kernel()
    return field


def test_energy_and_density_are_the_librarys() -> None:
    ours, theirs = field_in_water(library=False), field_in_water(library=True)
    assert ours.e_tot == pytest.approx(theirs.e_tot, abs=1e-7)
    assert np.abs(ours.make_rdm1() - theirs.make_rdm1()).max() < 1e-5


def test_it_answers_the_change_of_a_density_as_the_library_does() -> None:
    ours, theirs = field_in_water(library=False), field_in_water(library=True)
    change = np.random.default_rng(3).normal(size=(2, ours.mol.nao, ours.mol.nao))
    change += change.swapaxes(1, 2)
    expected = theirs.with_solvent._B_dot_x(change)
    assert np.abs(ours.with_solvent._B_dot_x(change) - expected).max() < 1e-6


def test_potentials_that_are_too_large_to_keep_change_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    kept = field_in_water(library=False)
    monkeypatch.setattr(continuum, "KEPT_MB", 0.0)
    anew = field_in_water(library=False)
    assert anew.with_solvent._potentials is None
    assert anew.e_tot == pytest.approx(kept.e_tot, abs=1e-7)


def test_gradient_is_the_change_of_the_energy() -> None:
    field = field_in_water(library=False)
    gradient = field.nuc_grad_method().kernel()[0, 0]
    step_bohr = 1e-3
    energies = []
    for sign in (1, -1):
        moved = FORMYL.coordinates_bohr.copy()
        moved[0, 0] += sign * step_bohr
        mole = build_mole(Point(FORMYL.moved(moved), LEVEL))
        energies.append(mean_field(mole, LEVEL, WATER, settings(LEVEL)).kernel(field.make_rdm1()))
    assert gradient == pytest.approx((energies[0] - energies[1]) / (2 * step_bohr), abs=2e-5)
