"""Direct and polarisation part, localised pairs, populations: laws and accepted chemistry."""

from functools import cache

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from unpaired.constants import BOHR_ANGSTROM, MHZ_PER_MT
from unpaired.diagnostics import parts_flags
from unpaired.electronic.integrals import minimal_basis
from unpaired.electronic.mole import build_mole
from unpaired.electronic.solve import solve
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.nuclei import table_isotope
from unpaired.origin import spin_origin
from unpaired.point import Point
from unpaired.properties.corresponding import corresponding_orbitals, occupied
from unpaired.properties.intrinsic import intrinsic_orbitals
from unpaired.properties.localise import localising_rotation
from unpaired.properties.partition import localised_pairs, pi_functions
from unpaired.structures.groups import find_groups

AROUND = np.deg2rad([0, 120, 240])


def methyl():
    """Planar, R(CH) 1.079 angstrom."""
    hydrogens = 1.079 * np.c_[np.cos(AROUND), np.sin(AROUND), 0 * AROUND]
    return "CHHH", np.vstack([[0, 0, 0], hydrogens])


def trifluoromethyl():
    """Pyramidal, R(CF) 1.318 angstrom, FCF 110.7 degrees (microwave structure, from memory)."""
    tilt = np.arcsin(np.sin(np.deg2rad(110.7 / 2)) / np.sin(np.deg2rad(60)))
    fluorines = (
        1.318 * np.c_[np.sin(tilt) * np.cos(AROUND), np.sin(tilt) * np.sin(AROUND), np.cos(tilt) + 0 * AROUND]
    )
    return "CFFF", np.vstack([[0, 0, 0], fluorines])


def ethyl():
    """Planar CH2 eclipsing no CH bond: one beta CH bond in the plane of the p orbital; idealised angles."""
    alpha = 1.082 * np.array([[np.cos(a), np.sin(a), 0] for a in np.deg2rad([60, -60])])
    tilt = np.deg2rad(180 - 111)
    turned = np.deg2rad([90, 210, 330])
    beta = np.c_[
        -1.49 - 1.10 * np.cos(tilt) + 0 * turned,
        1.10 * np.sin(tilt) * np.cos(turned),
        1.10 * np.sin(tilt) * np.sin(turned),
    ]
    return "CCHHHHH", np.vstack([[0, 0, 0], [-1.49, 0, 0], alpha, beta])


def allyl():
    """C2v, R(CC) 1.386, R(CH) 1.085 angstrom, CCC 124.5 degrees, the other angles 121."""
    half = np.deg2rad(124.5 / 2)
    end = 1.386 * np.array([np.sin(half), np.cos(half), 0])
    back = np.arctan2(-end[1], -end[0])
    outer = [end + 1.085 * np.array([np.cos(back + t), np.sin(back + t), 0]) for t in np.deg2rad([121, -121])]
    one_side = np.array([end, *outer])
    return "CCCHHHHH", np.vstack(
        [[[0, 0, 0], end, end * [-1, 1, 1], [0, -1.085, 0]], one_side[1:], one_side[1:] * [-1, 1, 1]]
    )


def dimethyl_nitroxide():
    """Planar, R(NO) 1.28, R(NC) 1.46, R(CH) 1.09 angstrom, CNC 121 degrees, tetrahedral methyl groups."""
    half, tilt = np.deg2rad(121 / 2), np.deg2rad(180 - 109.5)
    carbon = 1.46 * np.array([np.sin(half), -np.cos(half), 0])
    along, up = carbon / np.linalg.norm(carbon), np.array([0, 0, 1])
    hydrogens = [
        carbon
        + 1.09
        * (np.cos(tilt) * along + np.sin(tilt) * (np.cos(turn) * up + np.sin(turn) * np.cross(along, up)))
        for turn in AROUND
    ]
    one_side = np.array([carbon, *hydrogens])
    return "NOCHHHCHHH", np.vstack([[[0, 0, 0], [0, 1.28, 0]], one_side, one_side * [-1, 1, 1]])


@cache
def studied(structure, scf="UKS", functional="b3lyp"):
    """Point, state and origin at pcH-1, the table isotope of every nucleus."""
    elements, angstrom = structure()
    molecule = Molecule(tuple(elements), angstrom / BOHR_ANGSTROM, 0, 2)
    point = Point(molecule, Level(scf, "pcH-1", functional if scf == "UKS" else None))
    isotopes = [table_isotope(element).name for element in elements]
    state = solve(point)
    return point, state, spin_origin(point, state, find_groups(molecule, isotopes), isotopes)


def part(structure, atom, **level):
    row = studied(structure, **level)[2].atoms[atom]
    return row["direct_mT"], row["polarisation_mT"]


def pairs_of(structure, atom):
    rows = [row for row in studied(structure)[2].polarisation if row["atom"] == atom]
    return sorted(rows, key=lambda row: -abs(row["contribution_mT"]))


def test_methyl_is_all_polarisation():
    """Accepted: direct zero in the nodal plane, and the C-H pair dominates its own proton."""
    for atom in range(4):
        direct, polarisation = part(methyl, atom)
        assert direct == pytest.approx(0, abs=1e-6)
        assert abs(polarisation) > 2
    largest, second = pairs_of(methyl, "H3")[:2]
    assert (largest["pair"], largest["kind"]) == ("C1-H3", "valence sigma")
    assert largest["contribution_mT"] < 20 * -abs(second["contribution_mT"])


def test_the_core_of_methyl_carbon_opposes_its_bonds():
    """Common practice: the 1s shell is polarised against the valence pairs."""
    kinds = {row["pair"]: row["contribution_mT"] for row in pairs_of(methyl, "C1")}
    assert kinds["C1"] < 0 < kinds["C1-H2"]
    assert kinds["C1-H2"] == pytest.approx(kinds["C1-H4"], abs=1e-4)


@pytest.mark.slow
def test_trifluoromethyl_carbon_is_direct_and_fluorine_half():
    """Accepted: 13C nearly all direct, 19F about half (UHF; functionals polarise fluorine half as much)."""
    carbon, fluorine = (part(trifluoromethyl, atom, scf="UHF") for atom in (0, 1))
    assert carbon[0] / sum(carbon) == pytest.approx(1, abs=0.15)
    assert fluorine[0] / sum(fluorine) == pytest.approx(0.5, abs=0.2)


@pytest.mark.slow
def test_ethyl_beta_protons_are_direct_and_alpha_protons_polarised():
    """Accepted: beta protons by hyperconjugation of the singly occupied orbital, alpha by polarisation."""
    for atom in (2, 3):
        direct, polarisation = part(ethyl, atom)
        assert polarisation < -1.5
        assert abs(direct) < 0.15 * abs(polarisation)
    direct, polarisation = np.mean([part(ethyl, atom) for atom in (4, 5, 6)], axis=0)
    assert direct > 1.5
    assert 0 < polarisation < 0.6 * direct


@pytest.mark.slow
def test_allyl_centre_proton_is_positive_by_polarisation():
    """Accepted: two negative pairs and one positive centre proton, none of it direct."""
    direct, polarisation = part(allyl, 3)
    assert direct == pytest.approx(0, abs=1e-6)
    assert polarisation == pytest.approx(0.406, abs=0.15)  # measured 0.406 mT, measured.csv
    for atom in (4, 5, 6, 7):
        assert part(allyl, atom)[1] < -1
    populations = studied(allyl)[2].populations
    assert populations[0]["pi_spin_population"] < -0.05
    assert populations[1]["pi_spin_population"] > 0.4


def test_pairs_of_an_atom_sum_to_its_polarisation():
    for place, atom in enumerate(("C1", "H2", "H3", "H4")):
        total = sum(row["contribution_mT"] for row in pairs_of(methyl, atom))
        assert total == pytest.approx(part(methyl, place)[1], abs=1e-9)


def test_direct_and_polarisation_sum_to_the_coupling():
    point, state, origin = studied(methyl)
    from unpaired.constants import contact_coupling_MHz, mT_from_MHz
    from unpaired.properties.contact import spin_density_at_nuclei

    density = spin_density_at_nuclei(state.solution.spin_density_matrix, state.ao_at_nuclei)
    proton = table_isotope("H").nuclear_g
    whole = mT_from_MHz(contact_coupling_MHz(float(density[1]), proton, 2))
    row = origin.atoms[1]
    assert row["direct_mT"] + row["polarisation_mT"] == pytest.approx(whole, abs=1e-12)
    assert point.molecule.labels[1] == "H2"


def test_restricted_levels_have_no_polarisation_and_no_projection():
    _, _, origin = studied(methyl, scf="ROHF")
    assert all(row["polarisation_mT"] == 0 for row in origin.atoms)
    assert all("a_iso_projected_MHz" not in row for row in origin.atoms)
    assert origin.state == {}
    assert origin.polarisation == []


def test_kohn_sham_levels_are_not_projected():
    assert studied(methyl)[2].state == {}


def test_projection_scales_the_polarisation_of_methyl_by_a_third():
    """First-order rule S/(S+1) = 1/3; UHF methyl has <S^2> 0.7615, so second order stays below a tenth."""
    _, _, origin = studied(methyl, scf="UHF")
    for row in origin.atoms:
        assert row["a_iso_projected_mT"] == pytest.approx(row["polarisation_mT"] / 3, rel=0.1)
    assert origin.state["pure_spin_weight"] == pytest.approx(1 - 0.0115 / 3, abs=5e-4)  # 1 - D/(2S+2)
    assert origin.state["s_squared_without_next_spin"] == pytest.approx(0.75, abs=5e-4)


def test_populations_sum_to_twice_the_spin_and_methyl_is_pi():
    populations = studied(methyl)[2].populations
    assert sum(row["spin_population"] for row in populations) == pytest.approx(1, abs=1e-9)
    assert populations[0]["pi_spin_population"] == pytest.approx(1, abs=0.02)
    assert populations[1]["pi_spin_population"] == pytest.approx(0, abs=1e-6)


def test_intrinsic_orbitals_equal_those_of_pyscf():
    """Source: PySCF's lo.iao with the same minimal basis, orthogonalised symmetrically."""
    from pyscf import lo

    point, state, _ = studied(methyl)
    alpha, _ = occupied(state.solution.orbitals, state.solution.occupations)
    theirs = lo.vec_lowdin(lo.iao.iao(build_mole(point), alpha, minao="minao"), state.overlap)
    ours = intrinsic_orbitals(alpha, state.overlap, minimal_basis(point))
    assert ours == pytest.approx(theirs, abs=1e-8)


def test_local_pairs_do_not_depend_on_how_the_orbitals_were_mixed():
    point, state, _ = studied(methyl)
    alpha, beta = occupied(state.solution.orbitals, state.solution.occupations)
    minimal = minimal_basis(point)
    pi = pi_functions(point.molecule.coordinates_bohr, minimal)
    turn = np.linalg.qr(np.random.default_rng(0).normal(size=(4, 4)))[0]

    def found(beta):
        matched = corresponding_orbitals(alpha, beta, state.overlap)
        return localised_pairs(matched, state.overlap, state.ao_at_nuclei, minimal, pi)

    one, other = found(beta), found(beta @ turn)
    for mine, theirs in zip(one, other, strict=True):
        assert (mine.atoms, mine.kind) == (theirs.atoms, theirs.kind)
        assert mine.spin_density_au == pytest.approx(theirs.spin_density_au, abs=1e-6)


@settings(max_examples=25, deadline=None)
@given(st.integers(0, 10**6))
def test_localising_finds_hidden_local_orbitals(seed):
    """Orbitals that each live on one atom, mixed at random, are found again."""
    draw = np.random.default_rng(seed)
    atom = np.repeat(np.arange(4), 3)
    hidden = np.zeros((12, 4))
    for place in range(4):
        column = draw.normal(size=3)
        hidden[3 * place : 3 * place + 3, place] = column / np.linalg.norm(column)
    mixed = hidden @ np.linalg.qr(draw.normal(size=(4, 4)))[0]
    rotation = localising_rotation(mixed, atom)
    assert rotation.T @ rotation == pytest.approx(np.eye(4), abs=1e-10)
    found = np.abs(hidden.T @ mixed @ rotation)
    assert np.sort(found, axis=None) == pytest.approx(np.r_[np.zeros(12), np.ones(4)], abs=1e-6)


def test_a_diffuse_state_says_that_it_has_no_local_pairs():
    """Triplet helium: its second orbital is not made of the 1s function of the free atom."""
    molecule = Molecule(("He",), np.zeros((1, 3)), 0, 3)
    point = Point(molecule, Level("UHF", "pcH-1"))
    origin = spin_origin(point, solve(point), find_groups(molecule, ["3He"]), ["3He"])
    assert "too diffuse" in origin.details["populations"]
    assert origin.populations == []
    assert [row["kind"] for row in origin.polarisation] == ["not localised"]


def test_the_alpha_proton_has_a_minus_zero_plus_tensor():
    """Common practice: principal values of an alpha proton follow (-, 0, +) at about 30 MHz."""
    row = studied(methyl)[2].atoms[1]
    assert row["t_1_MHz"] == pytest.approx(-30, rel=0.5)
    assert row["t_2_MHz"] == pytest.approx(0, abs=5)
    assert row["t_3_MHz"] == pytest.approx(30, rel=0.5)
    for place in (1, 2, 3):
        whole = row[f"A_{place}_MHz"] - row[f"t_{place}_MHz"]
        assert whole == pytest.approx((row["direct_mT"] + row["polarisation_mT"]) * MHZ_PER_MT, abs=1e-9)


@pytest.mark.slow
def test_the_nitrogen_tensor_of_a_nitroxide():
    """Published for TEMPO in toluene: 14N principal values 16.8, 20.5, 95.9 MHz; their anisotropic part, 15 %.

    Dimethyl nitroxide stands for TEMPO: the same C-N(O)-C unit without the ring.
    """
    published = np.array([16.8, 20.5, 95.9])
    row = studied(dimethyl_nitroxide)[2].atoms[0]
    found = [row[f"t_{place}_MHz"] for place in (1, 2, 3)]
    assert found == pytest.approx(published - published.mean(), rel=0.15)


def stretched(distance_bohr):
    """Three hydrogen atoms in a row, one unpaired electron in all."""
    molecule = Molecule(
        ("H", "H", "H"), np.array([[0, 0, k * distance_bohr] for k in range(3)]), charge=0, multiplicity=2
    )
    return Point(molecule, Level("UHF", "pcseg-0"))


@pytest.mark.parametrize(("distance_bohr", "codes"), [(1.8, []), (12.0, ["parts-arbitrary"])])
def test_parts_of_a_broken_pair_are_called_arbitrary(distance_bohr, codes):
    point = stretched(distance_bohr)
    origin = spin_origin(point, solve(point), (), ("1H",) * 3)
    assert [flag.code for flag in parts_flags(point, origin.weakest_pair)] == codes
