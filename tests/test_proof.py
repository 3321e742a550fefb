"""Flags of a settled structure: equal copies of a minimum, saddles, Jahn-Teller minima."""

import numpy as np
import pytest

from unpaired.constants import BOHR_ANGSTROM
from unpaired.electronic.surface import Surface
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.proof import Model, curvature_flags, equal_minima_flags, jahn_teller
from unpaired.settled import Conformer

BENT = [("N", 0, 0, 0), ("H", 1.0, 0.1, 0), ("H", -0.3, 0.96, 0)]


def conformer(atoms: list[tuple], minimum: bool | None = True, charge: int = 0, order: int = 1) -> Conformer:
    positions = np.array([atom[1:] for atom in atoms]) / BOHR_ANGSTROM
    molecule = Molecule(tuple(atom[0] for atom in atoms), positions, charge, 2)
    return Conformer(molecule, 0.0, minimum, 12.0, None, order)


@pytest.mark.parametrize(("minimum", "codes"), [(True, []), (False, ["saddle"]), (None, ["flat-mode"])])
def test_curvature_becomes_a_flag(minimum: bool | None, codes: list[str]) -> None:
    assert [flag.code for flag in curvature_flags(conformer(BENT, minimum))] == codes


def test_atoms_equal_on_paper_that_differ_here_are_named() -> None:
    skewed = [*BENT[:2], ("H", -0.3, 1.1, 0)]
    (flag,) = equal_minima_flags(conformer(skewed), (0, 1, 1))
    assert flag.code == "equal-minima"
    assert "groups: [[H2, H3]]" in flag.advice


def test_atoms_equal_on_paper_and_here_are_not() -> None:
    assert equal_minima_flags(conformer([BENT[0], ("H", 0.8, 0.6, 0), ("H", -0.8, 0.6, 0)]), (0, 1, 1)) == []
    assert equal_minima_flags(conformer(BENT), ()) == []


@pytest.mark.slow
def test_a_distorted_ring_cation_is_a_jahn_teller_minimum() -> None:
    """H3 with one electron too few of a closed shell: H3 (neutral, D3h) is the textbook case of E x e.

    Neutral H3 at an equilateral triangle has a degenerate ground state (common practice); a slightly distorted
    triangle must be recognised as one of three.
    """
    side = 1.0
    equal = [
        (side / np.sqrt(3) * np.cos(a), side / np.sqrt(3) * np.sin(a), 0.0)
        for a in np.radians([90, 210, 330])
    ]
    equal[0] = (0.0, equal[0][1] + 0.06, 0.0)
    atoms = [("H", *position) for position in equal]
    one = conformer(atoms, order=4)
    surface = Surface(one.molecule, Level("UKS", "pcseg-1", "B3LYP"))
    energy, _ = surface(one.molecule.coordinates_bohr)
    found = jahn_teller(surface, Conformer(one.molecule, energy, True, 100.0, None, 4))
    assert found is not None
    assert found[0].code == "jahn-teller"
    assert "one of 3 equal minima" in found[0].advice


@pytest.mark.slow
def test_a_pyramid_that_inverts_is_no_jahn_teller_case() -> None:
    """CF3-like double wells have no slope at the symmetric structure; planar-to-pyramidal NH3+ here."""
    ring = [(1.02 * np.cos(a), 1.02 * np.sin(a), 0.05) for a in np.radians([0, 120, 240])]
    one = conformer([("N", 0, 0, 0), *[("H", *position) for position in ring]], charge=1, order=6)
    surface = Surface(one.molecule, Level("UKS", "pcseg-0", "B3LYP"))
    assert jahn_teller(surface, one) is None


def test_a_model_hessian_turns_with_the_structure() -> None:
    """A quarter turn about z takes the stiff direction x to y."""
    coordinates = np.array([[0.0, 0, 0], [1, 0, 0], [0, 2, 0], [0, 0, 3]])
    quarter = np.array([[0.0, -1, 0], [1, 0, 0], [0, 0, 1]])
    model = Model(coordinates, np.diag([3.0, 2, 1] * 4))
    turned = model.at(coordinates @ quarter.T + 5.0)
    np.testing.assert_allclose(turned, np.diag([2.0, 3, 1] * 4), atol=1e-12)
