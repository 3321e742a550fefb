"""Drawings: what a SMILES says, the starts made from it, which structures are the same."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from unpaired.constants import BOHR_ANGSTROM
from unpaired.errors import StructureError
from unpaired.molecule import Molecule
from unpaired.structures.conformers import alike_atoms, same_shape, starts
from unpaired.structures.distances import distance_matrix, neighbours
from unpaired.structures.smiles import read_smiles


@pytest.mark.parametrize(
    ("smiles", "elements", "charge", "open_valences"),
    [
        ("[CH3]", "C H H H", 0, 1),
        ("[H]", "H", 0, 1),
        ("[He+]", "He", 1, 1),
        ("[C]#N", "C N", 0, 1),
        ("[O][O]", "O O", 0, 2),
        ("C=[O+]", "C O H H", 1, 1),
        ("[CH2]C(=O)[O-]", "C C O O H H", -1, 1),
    ],
)
def test_atoms_charge_and_open_valences(smiles: str, elements: str, charge: int, open_valences: int) -> None:
    drawing = read_smiles(smiles)
    assert drawing.elements == tuple(elements.split())
    assert (drawing.charge, drawing.open_valences) == (charge, open_valences)


def test_isotope_labels_become_isotopes() -> None:
    assert read_smiles("[13CH2]C([2H])").isotopes == {"C1": "13C", "H3": "2H"}


@pytest.mark.parametrize(
    ("smiles", "message"),
    [
        ("", 'smiles "": there is no atom in it'),
        ("[CH3].[CH3]", 'smiles "[CH3].[CH3]": the dot makes it two molecules; give one radical'),
        ("*C", 'smiles "*C": "*" is not an element'),
        (
            "C(C)(C)(C)(C)C",
            'smiles "C(C)(C)(C)(C)C": Explicit valence for atom # 0 C, 5, is greater than permitted',
        ),
    ],
)
def test_refused_drawings(smiles: str, message: str) -> None:
    with pytest.raises(StructureError) as caught:
        read_smiles(smiles)
    assert caught.value.message == message


def test_broken_smiles_says_where() -> None:
    with pytest.raises(StructureError, match=r'smiles "C1CC": .*unclosed ring'):
        read_smiles("C1CC")


def test_both_ends_of_allyl_are_the_same_on_paper() -> None:
    classes = read_smiles("[CH2]C=C").classes
    assert classes[0] == classes[2]
    assert len({classes[i] for i in (3, 4, 6, 7)}) == 1
    assert classes[5] not in {classes[i] for i in (3, 4, 6, 7)}


def test_starts_are_bonded_as_drawn_and_not_on_the_saddle() -> None:
    """Embedded without a shake, HCO and vinyl are linear: the saddle of physics notes, section 10."""
    drawing = read_smiles("[CH]=O")
    for coordinates in starts(drawing):
        assert neighbours(drawing.elements, coordinates) == [(1, 2), (0,), (0,)]
        along = np.cross(coordinates[1] - coordinates[0], coordinates[2] - coordinates[0])
        assert np.linalg.norm(along) > 0.01


def test_starts_repeat_with_the_same_seed_and_differ_with_another() -> None:
    drawing = read_smiles("[CH2]C")
    np.testing.assert_array_equal(starts(drawing, 1)[0], starts(drawing, 1)[0])
    assert abs(starts(drawing, 1)[0] - starts(drawing, 2)[0]).max() > 0.01


def test_a_flexible_chain_has_several_starts() -> None:
    """n-Propyl: the CH2 end can stand in two ways against the chain."""
    drawing = read_smiles("[CH2]CC")
    found = starts(drawing)
    assert len(found) >= 3


@settings(max_examples=25, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_same_shape_whatever_the_place_hand_and_order(seed: int) -> None:
    random = np.random.default_rng(seed)
    elements = ["C", "H", "H", "F", "Cl"]
    shape = random.normal(size=(5, 3)) * 2
    order = random.permutation(5)
    image = Rotation.random(random_state=random).apply(shape)[order] * random.choice([1, -1]) + 3.0
    image_elements = [elements[i] for i in order]
    assert same_shape(
        sorted(elements), shape[np.argsort(elements, kind="stable")], _sorted(image_elements, image)
    )
    moved = shape.copy()
    moved[0] += 0.2 * (shape[0] - shape[1]) / distance_matrix(shape)[0, 1]
    assert not same_shape(elements, shape, moved)


def _sorted(elements: list[str], coordinates: np.ndarray) -> np.ndarray:
    return coordinates[np.argsort(elements, kind="stable")]


@pytest.mark.parametrize(("length", "kinds"), [(1.25, 2), (1.47, 1)])
def test_ligands_at_a_stiff_bond_are_told_apart_those_at_a_single_bond_are_not(
    length: float, kinds: int
) -> None:
    drawing = read_smiles("C=[N]")
    angstrom = np.array([[0, 0, 0], [0, 0, length], [0.94, 0, -0.54], [-0.94, 0, -0.54]])
    alike = alike_atoms(drawing, Molecule(drawing.elements, angstrom / BOHR_ANGSTROM, 0, 2))
    assert len(set(alike[2:])) == kinds


def test_beside_a_centre_of_handedness_nothing_is_taken_as_alike() -> None:
    """The two protons of the CH2 in CH3-CH-CH2-CH(F)Cl are diastereotopic: no turning exchanges them."""
    drawing = read_smiles("C[CH]CC(F)Cl")
    molecule = Molecule(drawing.elements, starts(drawing)[0] / BOHR_ANGSTROM, 0, 2)
    numbers = alike_atoms(drawing, molecule)
    assert len(set(numbers)) == len(numbers)
    assert not read_smiles("C[CH]CC").stereocentres
