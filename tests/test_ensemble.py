"""Thermal means over conformers: weights, equal copies, groups, missing states."""

import numpy as np
import pytest

from unpaired.constants import BOHR_ANGSTROM, contact_coupling_MHz, mT_from_MHz
from unpaired.ensemble import averaged_mT, conformer_rows
from unpaired.molecule import Molecule
from unpaired.nuclei import isotope
from unpaired.settled import Conformer, Settled
from unpaired.state import Failure, Solution, State
from unpaired.structures.groups import find_groups

POSITIONS = np.array([[0, 0, 0], [1.0, 0.1, 0], [-0.3, 0.96, 0]]) / BOHR_ANGSTROM
MOLECULE = Molecule(("N", "H", "H"), POSITIONS, 0, 2)
ISOTOPES = ("14N", "1H", "1H")


def state(*densities: float) -> State:
    """One function per nucleus, so that the spin density at nucleus i is densities[i]."""
    size = len(densities)
    orbitals = np.zeros((2, size, size))
    orbitals[0], orbitals[1] = np.diag(np.sqrt(np.abs(densities))), np.zeros((size, size))
    solution = Solution(0.0, 0.75, True, "", "", orbitals, np.ones((2, size)), np.zeros((2, size)))
    return State((solution,), 0, np.eye(size), np.eye(size), 1, 0.0)


def settled(weights: tuple[float, ...], alike: tuple[int, ...] = ()) -> Settled:
    conformers = tuple(
        Conformer(MOLECULE, 0.001 * place, True, 100.0, None, 1) for place in range(len(weights))
    )
    return Settled(MOLECULE, "", True, 100.0, conformers, weights, alike=alike)


def proton_mT(density: float) -> float:
    return mT_from_MHz(contact_coupling_MHz(density, isotope("1H").nuclear_g, 2))


GROUPS = find_groups(MOLECULE, ISOTOPES)


def test_the_mean_is_weighted() -> None:
    means = averaged_mT(settled((0.75, 0.25)), [state(0, 0.01, 0.02), state(0, 0.05, 0.02)], ISOTOPES, GROUPS)
    assert means is not None
    assert means[1] == pytest.approx(proton_mT(0.75 * 0.01 + 0.25 * 0.05))
    assert means[2] == pytest.approx(proton_mT(0.02))


def test_atoms_that_equal_copies_exchange_share_one_mean() -> None:
    both = [state(0, 0.01, 0.02), state(0, 0.05, 0.02)]
    means = averaged_mT(settled((0.75, 0.25), alike=(0, 1, 1)), both, ISOTOPES, GROUPS)
    assert means is not None
    assert means[1] == means[2] == pytest.approx(proton_mT((0.02 + 0.02) / 2))


def test_one_conformer_has_no_mean() -> None:
    assert averaged_mT(settled((1.0,)), [state(0, 0.01, 0.02)], ISOTOPES, GROUPS) is None


def test_a_conformer_without_a_state_leaves_no_mean_but_its_rows() -> None:
    outcomes = [state(0, 0.01, 0.02), Failure("not-converged", "no")]
    assert averaged_mT(settled((0.5, 0.5)), outcomes, ISOTOPES, GROUPS) is None
    rows = conformer_rows(settled((0.5, 0.5)), outcomes, ISOTOPES)
    assert [(row["conformer"], row["atom"]) for row in rows] == [
        (place, atom) for place in (1, 2) for atom in ("N1", "H2", "H3")
    ]
    assert rows[1]["a_iso_mT"] == pytest.approx(proton_mT(0.01))
    assert rows[4]["a_iso_mT"] is None
    assert rows[4]["relative_kJ_mol"] == pytest.approx(2.6255, abs=1e-3)
