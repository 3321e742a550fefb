"""Degenerate open shells by their symmetry: told where they are, not where a shape or a broken solution looks like one.

Which states are degenerate: species of the open shell in the point group's character table (common practice).
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from unpaired.constants import BOHR_ANGSTROM
from unpaired.electronic.solve import solve
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point
from unpaired.state import State

ANGLES = np.deg2rad([0.0, 120.0, 240.0])
TRIGON = np.c_[np.cos(ANGLES), np.sin(ANGLES), np.zeros(3)]
UP = np.array([0.0, 0.0, 1.0])


def molecule(elements: str, angstrom: object, charge: int = 0, multiplicity: int = 2) -> Molecule:
    return Molecule(tuple(elements.split()), np.array(angstrom, float) / BOHR_ANGSTROM, charge, multiplicity)


def ends_crossed(carbons: str, half: float, charge: int, multiplicity: int) -> Molecule:
    """CH2 groups at right angles at the ends of a chain: D2d."""
    side, end = 1.08 * np.sin(np.deg2rad(58.5)), half + 1.08 * np.cos(np.deg2rad(58.5))
    chain = [[0, 0, half], [0, 0, -half]] + ([[0, 0, 0]] if carbons == "C C C" else [])
    hydrogens = [[side, 0, end], [-side, 0, end], [0, side, -end], [0, -side, -end]]
    return molecule(f"{carbons} H H H H", [*chain, *hydrogens], charge, multiplicity)


ALLENE_CATION = ends_crossed("C C C", 1.31, 1, 2)
TWISTED_ETHYLENE = ends_crossed("C C", 0.73, 0, 3)
METHYL = molecule("C H H H", [[0, 0, 0], *(1.08 * TRIGON)])
METHOXY = molecule("C O H H H", [[0, 0, 0], [0, 0, 1.37], *(1.04 * TRIGON - 0.36 * UP)])
BORON_TRIFLUORIDE_CATION = molecule("B F F F", [[0, 0, 0], *(1.31 * TRIGON)], 1)


def state_of(radical: Molecule, scf: str = "ROHF") -> State:
    return solve(Point(radical, Level(scf, "pcseg-0")))


@pytest.mark.parametrize(
    ("radical", "expected"),
    [
        (
            ALLENE_CATION,
            "Jahn-Teller",
        ),  # 2E of D2d: no axis of order three, but an improper one of order four
        (METHOXY, "Jahn-Teller"),  # 2E of C3v
        (TWISTED_ETHYLENE, ""),  # both e orbitals singly occupied: 3A2 of D2d
        (METHYL, ""),  # 2A2'' of D3h
    ],
)
def test_degenerate_states_of_nonlinear_molecules(radical, expected):
    assert state_of(radical).engine["degenerate"] == expected


@pytest.mark.parametrize("angle", [0.3, 0.77])
def test_a_component_turned_off_the_axes_of_the_library_breaks_no_symmetry(angle):
    """E of C3v is a' + a'' about the mirror that the library picks; any mixture is as good a component."""
    turn = Rotation.from_rotvec([0.2, angle, 1.3 * angle]).as_matrix()
    state = state_of(METHOXY.moved(METHOXY.coordinates_bohr @ turn.T), "UHF")
    assert state.engine["degenerate"] == "Jahn-Teller"
    assert state.engine["symmetry_broken"] is False


def test_a_distortion_on_the_way_down_from_a_degenerate_shape_is_still_told():
    """One hydrogen of methoxy moved by 0.03 A: Cs, where the orbital is not degenerate by symmetry any more."""
    places = METHOXY.coordinates_bohr.copy()
    places[2] += [0.03 / BOHR_ANGSTROM, 0, 0]
    assert state_of(METHOXY.moved(places)).engine["degenerate"] == "Jahn-Teller"


@pytest.mark.slow
def test_an_open_shell_localised_on_one_of_three_equal_atoms_is_broken_and_not_degenerate():
    """Two thirds of such an orbital are of species E', one third of A2': no component of a degenerate state."""
    state = state_of(BORON_TRIFLUORIDE_CATION)
    assert state.engine["degenerate"] == ""
    assert state.engine["symmetry_broken"] is True


def test_atoms_and_lines_are_judged_alike_wherever_they_point():
    turn = Rotation.from_rotvec([0.4, -1.1, 0.7]).as_matrix()
    for atoms, multiplicity, expected in (
        ("O H", 2, "linear"),  # X 2Pi
        ("O O", 3, ""),  # X 3Sigma_g-
        ("B", 2, "atom"),  # 2P
        ("N", 4, ""),  # 4S
    ):
        places = np.array([[0, 0, 0], [0, 0, 1.1]])[: len(atoms.split())]
        radical = molecule(atoms, places @ turn.T, 0, multiplicity)
        assert state_of(radical, "UHF").engine["degenerate"] == expected, atoms


def test_an_anion_is_tested_for_stability_in_its_own_basis():
    """The scout's basis has no diffuse functions: its verdict stands for formyl, not for an anion."""
    carbon_dioxide_anion = molecule("C O O", [[0, 0, 0], [1.1, 0.5, 0], [-1.1, 0.5, 0]], -1)
    state = solve(Point(carbon_dioxide_anion, Level("UHF", "pcseg-1")))
    assert state.stable is True
    assert state.engine["stability_note"] == ""
    formyl = molecule("C O H", [[0, 0, 0], [0, 0, 1.18], [0.94, 0, -0.6]])
    assert solve(Point(formyl, Level("UHF", "pcseg-1"))).engine["stability_note"] == "judged in pcseg-0"


@pytest.mark.slow
def test_pairs_that_break_the_symmetry_are_no_degenerate_state():
    """NO3 in UHF: spins of about +0.9, +0.9 and -0.7 on three equal oxygens, <S^2> 1.44; its open shell alone is like E'."""
    nitrate = molecule("N O O O", [[0, 0, 0], *(1.24 * TRIGON)])
    state = state_of(nitrate, "UHF")
    assert state.engine["degenerate"] == ""
    assert state.engine["symmetry_broken"] is True
