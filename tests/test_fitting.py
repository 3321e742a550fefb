"""Fitted Coulomb and exchange against the library's own contraction of the same integrals."""

import numpy as np
import pytest
import scipy.linalg
from pyscf import df, gto, lib, scf

from unpaired.electronic import exchange, fitting, threeindex
from unpaired.electronic.auxiliary import auxiliary_basis
from unpaired.electronic.meanfield import mean_field
from unpaired.electronic.mole import build_mole
from unpaired.electronic.settings import settings
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point

SET = {element: auxiliary_basis("def2-universal-jkfit + free s, p", element) for element in "CHO"}


@pytest.fixture(scope="module")
def mole() -> gto.Mole:
    return gto.M(atom="C 0 0 0; O 0 0 2.2; H 1.8 0 -0.9", unit="Bohr", basis="6-31G*", spin=1, verbose=0)


@pytest.fixture(autouse=True)
def forget():
    fitting.release()
    yield
    fitting.release()


def same_as_the_library(mole, dm):
    ours = fitting.Fitting(mole, SET).get_jk(dm)
    for mine, theirs in zip(ours, df.DF(mole, SET).get_jk(dm), strict=True):
        np.testing.assert_allclose(mine, theirs, atol=1e-10)


def test_unrestricted_density_with_orbitals(mole):
    orbitals = np.random.default_rng(2).normal(size=(2, mole.nao, mole.nao))
    occupations = np.zeros((2, mole.nao))
    occupations[0, :8] = occupations[1, :7] = 1
    same_as_the_library(mole, scf.UHF(mole).make_rdm1(orbitals, occupations))


def test_restricted_open_density_with_orbitals(mole):
    orbitals = np.random.default_rng(3).normal(size=(mole.nao, mole.nao))
    occupations = np.array([2.0] * 7 + [1.0] + [0.0] * (mole.nao - 8))
    same_as_the_library(mole, scf.ROHF(mole).make_rdm1(orbitals, occupations))


def test_any_symmetric_matrices(mole):
    dm = np.random.default_rng(4).normal(size=(3, mole.nao, mole.nao))
    same_as_the_library(mole, dm + dm.swapaxes(1, 2))


def test_one_matrix_of_no_electrons(mole):
    same_as_the_library(mole, np.zeros((mole.nao, mole.nao)))


def test_small_batches_give_the_same(mole, monkeypatch):
    dm = lib.hermi_triu(np.random.default_rng(6).normal(size=(mole.nao, mole.nao)))
    whole = fitting.Fitting(mole, SET).get_jk(dm)
    fitting.release()
    monkeypatch.setattr(exchange, "BATCH_MB", 0.02)
    monkeypatch.setattr(threeindex, "CHUNK_MB", 0.02)
    for mine, expected in zip(fitting.Fitting(mole, SET).get_jk(dm), whole, strict=True):
        np.testing.assert_allclose(mine, expected, atol=1e-11)


def test_levels_of_one_molecule_share_their_integrals(mole):
    first, second = fitting.Fitting(mole, SET).build(), fitting.Fitting(mole.copy(), SET).build()
    assert second.integrals() is first.integrals()


def test_a_moved_atom_gets_its_own_integrals(mole):
    first = fitting.Fitting(mole, SET).build()
    coordinates = mole.atom_coords()
    coordinates[1, 2] += 0.1
    moved = mole.copy().set_geom_(coordinates, unit="Bohr")
    second = fitting.Fitting(moved, SET).build()
    theirs = np.vstack(list(df.DF(moved, SET).loop()))
    np.testing.assert_allclose(np.vstack(list(second.loop())), theirs, atol=1e-10)
    assert not np.allclose(np.vstack(list(first.loop())), theirs)


def test_a_scout_in_another_basis_does_not_push_out_the_integrals(mole):
    small = gto.M(atom=mole.atom, unit="Bohr", basis="sto-3g", spin=1, verbose=0)
    first = fitting.Fitting(mole, SET).build()
    fitting.Fitting(small, SET).build()
    assert fitting.Fitting(mole.copy(), SET).build().integrals() is first.integrals()


def test_only_the_latest_integrals_are_kept(mole):
    for basis in ("sto-3g", "3-21g", "6-31g"):
        fitting.Fitting(gto.M(atom=mole.atom, unit="Bohr", basis=basis, spin=1, verbose=0), SET).build()
    assert len(fitting._kept) == fitting.KEPT


def test_part_of_the_coulomb_operator_for_range_separated_functionals(mole):
    dm = np.random.default_rng(8).normal(size=(2, mole.nao, mole.nao))
    dm = dm + dm.swapaxes(1, 2)
    ours, theirs = fitting.Fitting(mole, SET), df.DF(mole, SET)
    whole = ours.get_jk(dm)
    for omega in (0.33, -0.33):
        for mine, expected in zip(ours.get_jk(dm, omega=omega), theirs.get_jk(dm, omega=omega), strict=True):
            np.testing.assert_allclose(mine, expected, atol=1e-9)
    np.testing.assert_array_equal(ours.get_jk(dm)[1], whole[1])


def orthonormal(mole, seed, angle=0.0):
    """Alpha and beta orbitals of a random symmetric matrix, turned a little."""
    overlap = mole.intor("int1e_ovlp")
    values, vectors = np.linalg.eigh(overlap)
    root = vectors / np.sqrt(values) @ vectors.T
    random = np.random.default_rng(seed).normal(size=overlap.shape)
    turn = scipy.linalg.expm(angle * (random - random.T) / len(random))
    return root @ np.linalg.eigh(random + random.T)[1] @ turn


def density(mole, orbitals):
    occupations = np.zeros((2, orbitals.shape[1]))
    occupations[0, :8] = occupations[1, :7] = 1
    return scf.UHF(mole).make_rdm1(np.stack([orbitals] * 2), occupations)


@pytest.mark.parametrize("angle", [0.0, 1e-4, 1e-2])
def test_exchange_near_an_earlier_density_acts_rightly_on_occupied_orbitals(mole, angle):
    first, second = orthonormal(mole, 9), orthonormal(mole, 9, angle)
    ours = fitting.Fitting(mole, SET)
    ours.get_jk(density(mole, first))
    taken, theirs = ours.get_jk(density(mole, second))[1], df.DF(mole, SET).get_jk(density(mole, second))[1]
    assert ours._anchor is not None
    np.testing.assert_array_equal(ours._anchor.orbitals[0], first[:, :8])
    np.testing.assert_allclose(taken, taken.swapaxes(1, 2), atol=1e-12)
    for mine, expected, count in zip(taken, theirs, (8, 7), strict=True):
        np.testing.assert_allclose(
            mine @ second[:, :count], expected @ second[:, :count], atol=1e-9 + 1e-6 * angle
        )


def test_exchange_far_from_an_earlier_density_is_made_anew(mole):
    ours = fitting.Fitting(mole, SET)
    ours.get_jk(density(mole, orthonormal(mole, 9)))
    second = density(mole, orthonormal(mole, 10))
    np.testing.assert_allclose(ours.get_jk(second)[1], df.DF(mole, SET).get_jk(second)[1], atol=1e-10)


def test_what_the_caller_does_with_a_matrix_does_not_change_the_next(mole):
    """The library scales the exchange matrices of hybrid functionals in place."""
    ours, dm = fitting.Fitting(mole, SET), density(mole, orthonormal(mole, 11))
    first = ours.get_jk(dm)[1]
    before = first.copy()
    first *= 0.2
    np.testing.assert_allclose(ours.get_jk(dm)[1], before, atol=1e-12)


def test_rough_and_responding_are_single_precision_and_end(mole):
    ours, dm = fitting.Fitting(mole, SET), np.array(density(mole, orthonormal(mole, 12)))
    exact = ours.get_jk(dm)[1]
    for stage in (ours.rough, ours.responding):
        with stage():
            single = ours.get_jk(dm)[1]
        assert 1e-9 < np.abs(single - exact).max() < 1e-4
        np.testing.assert_array_equal(ours.get_jk(dm)[1], exact)


def test_forgotten_density_leaves_a_whole_matrix(mole):
    ours, orbitals = fitting.Fitting(mole, SET), orthonormal(mole, 13, 1e-2)
    ours.get_jk(density(mole, orthonormal(mole, 13)))
    ours.forget()
    dm = density(mole, orbitals)
    np.testing.assert_allclose(ours.get_jk(dm)[1], df.DF(mole, SET).get_jk(dm)[1], atol=1e-10)


def test_bounds_are_the_self_repulsion_of_each_pair():
    """Largest over the directions of a pair of contracted functions; the molecule has contractions of one shell."""
    mole = gto.M(atom="O 0 0 0; H 0 0.3 1.8", unit="Bohr", basis="pcseg-1", spin=1, verbose=0)
    whole = mole.intor("int2e").reshape((mole.nao,) * 4)
    exact = np.sqrt(np.abs(np.einsum("mnmn->mn", whole)))
    bounds = threeindex.pair_bounds(mole)
    assert np.all(bounds >= exact - 1e-9)
    sharp = np.isclose(bounds, exact, atol=1e-9)
    assert all(row.any() for row in sharp)
    assert np.all(bounds <= 30 * np.maximum(exact.max(axis=1), exact.max(axis=0)))


def test_distant_pairs_are_left_out_and_change_little():
    atoms = "; ".join(f"H 0 0 {4.0 * k}" for k in range(5))
    mole = gto.M(atom=atoms, unit="Bohr", basis="pcseg-0", spin=1, verbose=0)
    shells = {"H": auxiliary_basis("def2-universal-jkfit + free s, p", "H")}
    ours = fitting.Fitting(mole, shells)
    assert ours.integrals().packed.shape[1] < mole.nao * (mole.nao + 1) // 2
    dm = np.eye(mole.nao)
    for mine, theirs in zip(ours.get_jk(dm), df.DF(mole, shells).get_jk(dm), strict=True):
        np.testing.assert_allclose(mine, theirs, atol=1e-6)


def test_a_range_separated_functional_ends_in_double_precision():
    """The library keeps a copy of the fitting for the long range: the rough stage must not stay in it."""
    level = Level("UKS", "pcseg-0", "CAM-B3LYP")
    formyl = Molecule(("C", "O", "H"), np.array([[0, 0, 0], [0, 0, 2.22], [1.77, 0, -1.12]]), 0, 2)
    field = mean_field(build_mole(Point(formyl, level)), level, None, settings(level))
    field.kernel()
    grids, plain = field.grids, field.mol.UKS(xc="CAM-B3LYP").density_fit(auxbasis=field.with_df.auxbasis)
    plain.grids, plain.conv_tol, plain.verbose = grids, 1e-10, 0
    assert field.converged
    assert field.e_tot == pytest.approx(plain.kernel(), abs=2e-8)
