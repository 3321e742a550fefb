"""Stability, labels, several solutions and what is said about them: small molecules whose states are known."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from unpaired.constants import BOHR_ANGSTROM
from unpaired.electronic.solve import solve
from unpaired.errors import ConvergenceError
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point
from unpaired.solutions import (
    disagreement_flags,
    projection_flags,
    same_state,
    solution_rows,
    state_columns,
    state_flags,
)


def molecule(elements: str, angstrom: object, charge: int = 0, multiplicity: int = 2) -> Molecule:
    return Molecule(tuple(elements.split()), np.array(angstrom, float) / BOHR_ANGSTROM, charge, multiplicity)


NITROGEN_CATION = molecule("N N", [[0, 0, 0], [0, 0, 1.116]], 1)
HYDROXYL = molecule("O H", [[0, 0, 0], [0, 0, 0.970]])


def point(of: Molecule, scf: str = "UHF", basis: str = "pcseg-0", solution: int | str | None = None) -> Point:
    functional = "B3LYP" if scf in ("UKS", "ROKS") else None
    return Point(of, Level(scf, basis, functional, solution=solution))


@pytest.fixture(scope="module")
def nitrogen_states():
    return {scf: solve(point(NITROGEN_CATION, scf)) for scf in ("UHF", "UKS")}


def test_solutions_come_lowest_first_and_the_lowest_stable_is_taken(nitrogen_states):
    for state in nitrogen_states.values():
        energies = [one.energy_Eh for one in state.solutions]
        assert energies == sorted(energies)
        assert state.solution.stable is True
        assert state.energy_Eh == min(one.energy_Eh for one in state.solutions if one.stable)


def test_density_functional_finds_the_sigma_state_of_the_nitrogen_cation(nitrogen_states):
    """X 2Sigma_g+ is the ground state of N2+: common practice (Herzberg, Spectra of Diatomic Molecules)."""
    assert nitrogen_states["UKS"].solution.label == "sigma_g"


def test_a_level_may_ask_for_another_solution_by_label_and_by_place(nitrogen_states):
    lowest = nitrogen_states["UHF"]
    asked = solve(point(NITROGEN_CATION, solution="pi_u"))
    assert asked.solution.label == "pi_u"
    assert asked.energy_Eh > lowest.energy_Eh + 1e-3
    codes = [flag.code for flag in state_flags(point(NITROGEN_CATION), asked)]
    assert "not-the-lowest" in codes
    again = solve(point(NITROGEN_CATION, solution=asked.taken + 1))
    assert again.energy_Eh == pytest.approx(asked.energy_Eh, abs=1e-8)


def test_gap_to_the_nearest_other_solution_is_told(nitrogen_states):
    state = nitrogen_states["UHF"]
    first, second = (one.energy_Eh for one in state.solutions[:2])
    assert state_columns(state)["energy_gap_to_next_Eh"] == second - first
    alone = replace(state, solutions=state.solutions[:1])
    assert state_columns(alone)["energy_gap_to_next_Eh"] is None


def test_a_solution_that_is_not_there_is_refused_with_those_that_are(nitrogen_states):
    with pytest.raises(ConvergenceError, match="1: s"):
        solve(point(molecule("H", [[0, 0, 0]]), basis="pcH-1", solution="delta_g"))


def test_levels_in_different_states_are_flagged(nitrogen_states):
    points = [point(NITROGEN_CATION, scf) for scf in nitrogen_states]
    states = dict(nitrogen_states)
    labels = [one.label for one in states["UHF"].solutions]
    states["UHF"] = replace(states["UHF"], taken=labels.index("pi_u"))
    flags = disagreement_flags(points, list(states.values()))
    assert {flag.level for flag in flags} == {"UHF/pcseg-0", "UKS-B3LYP/pcseg-0"}
    assert {(flag.code, flag.severity) for flag in flags} == {("levels-disagree", "bad")}


def test_levels_in_one_state_are_not_flagged():
    states = [solve(point(HYDROXYL, scf)) for scf in ("UHF", "ROHF")]
    assert same_state(*states)
    assert disagreement_flags([point(HYDROXYL, scf) for scf in ("UHF", "ROHF")], states) == []


@pytest.mark.parametrize(
    ("radical", "label", "degenerate"),
    [
        (molecule("N", [[0, 0, 0]], 0, 4), "p x3", ""),  # 4S
        (molecule("O", [[0, 0, 0]], 0, 3), "p x2", "atom"),  # 3P
        (molecule("C", [[0, 0, 0]], 0, 3), "p x2", "atom"),  # 3P
        (molecule("H", [[0, 0, 0]]), "s", ""),  # 2S
        (HYDROXYL, "pi", "linear"),  # X 2Pi
        (molecule("O O", [[0, 0, 0], [0, 0, 1.208]], 0, 3), "pi_g x2", ""),  # X 3Sigma_g-
    ],
)
def test_terms_of_atoms_and_diatomics(radical, label, degenerate):
    """Ground terms: NIST atomic spectra database and Herzberg, both common practice."""
    state = solve(point(radical))
    assert (state.solution.label, state.engine["degenerate"]) == (label, degenerate)
    codes = [flag.code for flag in state_flags(point(radical), state)]
    assert ("degenerate" in codes) == bool(degenerate)
    assert state.stable is True


def test_degenerate_open_shell_of_methane_cation_is_told():
    """Td CH4+ has a 2T2 ground state and distorts: common practice."""
    corner = 0.629
    shape = [[0, 0, 0], *(corner * np.array([[1, 1, 1], [-1, -1, 1], [-1, 1, -1], [1, -1, -1]]))]
    state = solve(point(molecule("C H H H H", shape, 1)))
    assert state.engine["degenerate"] == "Jahn-Teller"


def test_an_open_shell_of_two_degenerate_orbitals_is_named_as_a_whole():
    """Twisted triplet ethylene, D2d: one electron in each p orbital; e of D2d is b2 + b3 of D2 (correlation tables)."""
    side, end = 1.08 * np.sin(np.deg2rad(58.5)), 0.73 + 1.08 * np.cos(np.deg2rad(58.5))
    shape = [[0, 0, 0.73], [0, 0, -0.73], [side, 0, end], [-side, 0, end], [0, side, -end], [0, -side, -end]]
    assert solve(point(molecule("C C H H H H", shape, 0, 3))).solution.label == "b2 b3"


@pytest.mark.slow
def test_two_runs_agree_and_turning_the_molecule_changes_nothing():
    """Limits of the task: 1e-8 Eh between runs, 1e-6 Eh under rotation."""
    first, second = (solve(point(NITROGEN_CATION)) for _ in range(2))
    assert second.energy_Eh == pytest.approx(first.energy_Eh, abs=1e-8)
    turn = Rotation.from_rotvec([0.4, -1.1, 0.7]).as_matrix()
    turned = solve(point(NITROGEN_CATION.moved(NITROGEN_CATION.coordinates_bohr @ turn.T)))
    assert turned.energy_Eh == pytest.approx(first.energy_Eh, abs=1e-6)
    assert turned.s_squared == pytest.approx(first.s_squared, abs=1e-4)


def test_every_solution_gets_a_row_for_every_nucleus(nitrogen_states):
    state = nitrogen_states["UHF"]
    rows = solution_rows(point(NITROGEN_CATION), state, ["14N", None])
    assert [(row["solution"], row["atom"]) for row in rows] == [
        (place, atom) for place in range(1, len(state.solutions) + 1) for atom in ("N1", "N2")
    ]
    assert [row["taken"] for row in rows[:2]] == [True, True]
    assert rows[1]["a_iso_mT"] is None
    assert rows[0]["energy_above_lowest_Eh"] == 0.0


def test_an_unstable_and_an_untested_solution_are_told(nitrogen_states):
    state = nitrogen_states["UHF"]
    for stable, code in ((False, "unstable"), (None, "stability-unknown")):
        changed = replace(state, solutions=(replace(state.solution, stable=stable),), taken=0)
        assert code in [flag.code for flag in state_flags(point(NITROGEN_CATION), changed)]


def test_size_of_the_contamination_is_told_where_projection_changes_much():
    rows = [
        {"atom": "C1", "a_iso_mT": 4.0, "a_iso_projected_mT": 2.0},
        {"atom": "H2", "a_iso_mT": -1.0, "a_iso_projected_mT": -0.9},
    ]
    (flag,) = projection_flags(point(HYDROXYL), rows)
    assert (flag.value, flag.limit) == (2.0, 0.4)
    assert "C1: +4.000 mT becomes +2.000 mT" in flag.advice
    assert projection_flags(point(HYDROXYL, "UKS"), rows) == []


def test_restricted_open_solutions_are_tested_in_a_continuum_too():
    from unpaired.point import Solvent

    radical = point(HYDROXYL, "ROHF")
    assert solve(replace(radical, solvent=Solvent("water", 78.4))).stable is True
