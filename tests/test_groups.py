"""Equivalent nuclei: point groups known from textbooks, turning rotors, the user's own sets, isotopes."""

import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from unpaired.constants import BOHR_ANGSTROM
from unpaired.errors import StructureError
from unpaired.molecule import Molecule
from unpaired.structures.groups import find_groups, freely_turning
from unpaired.structures.symmetry import equivalence, permutations


def ring(element: str, radius: float, count: int, start: float = 0.0, height: float = 0.0) -> list[tuple]:
    angles = start + 2 * np.pi * np.arange(count) / count
    return [(element, radius * np.cos(a), radius * np.sin(a), height) for a in angles]


def molecule(atoms: list[tuple]) -> Molecule:
    positions = np.array([atom[1:] for atom in atoms], dtype=float) / BOHR_ANGSTROM
    return Molecule(tuple(atom[0] for atom in atoms), positions, 0, 2)


def sets(atoms: list[tuple]) -> list[tuple[int, ...]]:
    m = molecule(atoms)
    return equivalence(m.elements, m.coordinates_angstrom)


METHYL = [("C", 0, 0, 0), *ring("H", 1.08, 3)]
# Ethyl-like: a planar CH2 on the axis of a methyl group; only a mirror plane is left.
ETHYL = [
    ("C", 0, 0, 0),
    ("C", 1.49, 0, 0),
    ("H", -0.56, 0.93, 0),
    ("H", -0.56, -0.93, 0),
    *[("H", 1.86, 1.03 * np.cos(a), 1.03 * np.sin(a)) for a in np.radians([90, 210, 330])],
]
METHANE = [
    ("C", 0, 0, 0),
    *[("H", 0.63 * x, 0.63 * y, 0.63 * x * y) for x, y in [(1, 1), (1, -1), (-1, 1), (-1, -1)]],
]
GOLDEN = (1 + 5**0.5) / 2


def buckyball() -> list[tuple]:
    """C60 as a truncated icosahedron of edge 1.42 angstrom."""
    corners = set()
    for a, b, c in [(0, 1, 3 * GOLDEN), (1, 2 + GOLDEN, 2 * GOLDEN), (GOLDEN, 2, 2 * GOLDEN + 1)]:
        for x in {a, -a}:
            for y in {b, -b}:
                for z in {c, -c}:
                    corners |= {(x, y, z), (y, z, x), (z, x, y)}
    return [("C", *(0.71 * np.array(corner))) for corner in sorted(corners)]


@pytest.mark.parametrize(
    ("atoms", "expected"),
    [
        ([("N", 0, 0, 0)], [(0,)]),
        ([("C", 0, 0, 0), ("N", 0, 0, 1.17)], [(0,), (1,)]),
        ([("O", 0, 0, 0), ("O", 0, 0, 1.2)], [(0, 1)]),
        ([("O", 0, 0, -1.16), ("C", 0, 0, 0), ("O", 0, 0, 1.16)], [(0, 2), (1,)]),
        ([("N", 0, 0, 0), ("H", 0.8, 0.6, 0), ("H", -0.8, 0.6, 0)], [(0,), (1, 2)]),
        (METHYL, [(0,), (1, 2, 3)]),
        ([("C", 0, 0, 0.3), *ring("F", 1.26, 3)], [(0,), (1, 2, 3)]),
        ([*ring("C", 1.39, 6), *ring("H", 2.48, 6)], [tuple(range(6)), tuple(range(6, 12))]),
        (ETHYL, [(0,), (1,), (2, 3), (4,), (5, 6)]),
        (
            # Only the twofold axis of a twisted H2O2-like frame relates the two ends: a proper operation.
            [("O", 0.7, 0, 0), ("O", -0.7, 0, 0), ("H", 0.8, 0.8, 0.5), ("H", -0.8, -0.8, 0.5)],
            [(0, 1), (2, 3)],
        ),
        (
            # Only inversion relates the two ends: an improper operation.
            [("N", 0.7, 0.2, 0.1), ("N", -0.7, -0.2, -0.1), ("H", 1.1, 0.9, 0.7), ("H", -1.1, -0.9, -0.7)],
            [(0, 1), (2, 3)],
        ),
        ([("C", 0, 0, 0), ("H", 1, 0, 0), ("F", 0, 1.3, 0), ("Cl", 0, 0, 1.7)], [(0,), (1,), (2,), (3,)]),
    ],
)
def test_equivalent_sets_of_textbook_shapes(atoms: list[tuple], expected: list[tuple[int, ...]]) -> None:
    assert sets(atoms) == expected


@pytest.mark.parametrize(
    ("atoms", "order"),
    [
        (METHYL, 6),  # D3h has 12 operations; the plane of the molecule moves no atom
        (METHANE, 24),  # Td
        (buckyball(), 120),  # Ih
    ],
)
def test_number_of_permutations_is_the_order_of_the_group(atoms: list[tuple], order: int) -> None:
    m = molecule(atoms)
    assert len({tuple(p) for p in permutations(m.elements, m.coordinates_angstrom)}) == order


def test_sixty_atoms_take_less_than_a_second() -> None:
    start = time.process_time()
    assert sets(buckyball()) == [tuple(range(60))]
    assert time.process_time() - start < 1.0


@pytest.mark.parametrize(("shift", "expected"), [(0.005, 1), (0.1, 2)])
def test_tolerance_is_where_it_is_stated(shift: float, expected: int) -> None:
    atoms = [("O", 0, 0, 0), ("H", 0.8, 0.6, 0), ("H", -0.8 - shift, 0.6, 0)]
    assert len(sets(atoms)) - 1 == expected


@settings(max_examples=40, deadline=None)
@given(
    st.sampled_from([METHYL, ETHYL, [*ring("C", 1.39, 6), *ring("H", 2.48, 6)], buckyball()[:10]]),
    st.integers(0, 2**32 - 1),
)
def test_rotation_translation_reflection_and_order_change_nothing(atoms: list[tuple], seed: int) -> None:
    random = np.random.default_rng(seed)
    m = molecule(atoms)
    order = random.permutation(len(atoms))
    turned = Rotation.random(random_state=random).apply(m.coordinates_angstrom.copy()) * random.choice(
        [1, -1]
    )
    turned = turned + random.normal(size=3)
    found = equivalence([m.elements[i] for i in order], turned[order])
    back = sorted(tuple(sorted(int(order[i]) for i in members)) for members in found)
    assert back == equivalence(m.elements, m.coordinates_angstrom)


def protons(m: Molecule) -> list[str | None]:
    return ["1H" if element == "H" else None for element in m.elements]


def test_methyl_radical_is_one_group_by_symmetry() -> None:
    m = molecule(METHYL)
    assert freely_turning(m) == []
    (group,) = find_groups(m, protons(m))
    assert (group.label, group.members, group.isotope, group.origin) == ("H2", (1, 2, 3), "1H", "symmetry")


def test_methyl_group_of_ethyl_turns() -> None:
    m = molecule(ETHYL)
    assert freely_turning(m) == [(1, 0, (4, 5, 6))]
    assert [(g.label, g.members, g.origin) for g in find_groups(m, protons(m))] == [
        ("H3", (2, 3), "symmetry"),
        ("H5", (4, 5, 6), "rotor"),
    ]


def test_a_turning_methyl_group_does_not_spoil_the_symmetry_of_the_rest() -> None:
    """Two CH2 protons on either side of the plane stay equivalent however the methyl group stands."""
    turned = [
        *ETHYL[:4],
        *[("H", 1.86, 1.03 * np.cos(a), 1.03 * np.sin(a)) for a in np.radians([77, 197, 317])],
    ]
    m = molecule(turned)
    assert equivalence(m.elements, m.coordinates_angstrom) == [(i,) for i in range(7)]
    assert [(g.members, g.origin) for g in find_groups(m, protons(m))] == [
        ((2, 3), "rotor"),
        ((4, 5, 6), "rotor"),
    ]


def test_deuterium_splits_a_group_and_both_parts_visit_all_sites() -> None:
    m = molecule(ETHYL)
    isotopes = protons(m)
    isotopes[5] = "2H"
    rotor = [(g.label, g.isotope, g.members, g.origin, g.sites) for g in find_groups(m, isotopes)[1:]]
    assert rotor == [
        ("H5", "1H", (4, 6), "rotor", (4, 5, 6)),
        ("H6", "2H", (5,), "single", (4, 5, 6)),
    ]


def test_sets_of_the_user_are_united_with_what_they_touch() -> None:
    m = molecule(ETHYL)
    (group,) = find_groups(m, protons(m), [["H3", "H5"]])
    assert (group.members, group.origin) == ((2, 3, 4, 5, 6), "user")


def test_sets_of_the_user_that_add_nothing_change_nothing() -> None:
    m = molecule(ETHYL)
    assert find_groups(m, protons(m), [["H5", "H6"]]) == find_groups(m, protons(m))


def test_isotopes_of_other_elements_are_groups_of_their_own() -> None:
    m = molecule(METHYL)
    assert [g.label for g in find_groups(m, ["13C", "1H", "1H", "1H"])] == ["C1", "H2"]


@pytest.mark.parametrize(
    ("labels", "message"),
    [
        (["H2", "H9"], 'groups: atom "H9" is not in the structure (C1 to H4)'),
        (["C1", "H2"], "groups: [C1, H2] mixes elements; one group holds one element"),
    ],
)
def test_impossible_sets_of_the_user_are_refused(labels: list[str], message: str) -> None:
    m = molecule(METHYL)
    with pytest.raises(StructureError) as caught:
        find_groups(m, protons(m), [labels])
    assert caught.value.message == message
