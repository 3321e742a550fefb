"""Fitted Coulomb and exchange against the library's own contraction of the same integrals."""

import numpy as np
import pytest
from pyscf import df, gto, lib, scf

from unpaired.electronic import fitting
from unpaired.electronic.auxiliary import auxiliary_basis

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
    monkeypatch.setattr(fitting, "BATCH_MB", 0.02)
    for mine, expected in zip(fitting.Fitting(mole, SET).get_jk(dm), whole, strict=True):
        np.testing.assert_allclose(mine, expected, atol=1e-11)


def test_levels_of_one_molecule_share_their_integrals(mole):
    first, second = fitting.Fitting(mole, SET).build(), fitting.Fitting(mole.copy(), SET).build()
    assert second._cderi is first._cderi


def test_a_moved_atom_gets_its_own_integrals(mole):
    first = fitting.Fitting(mole, SET).build()
    coordinates = mole.atom_coords()
    coordinates[1, 2] += 0.1
    moved = mole.copy().set_geom_(coordinates, unit="Bohr")
    second = fitting.Fitting(moved, SET).build()
    np.testing.assert_array_equal(second._cderi, df.DF(moved, SET).build()._cderi)
    assert not np.allclose(first._cderi, second._cderi)


def test_a_scout_in_another_basis_does_not_push_out_the_integrals(mole):
    small = gto.M(atom=mole.atom, unit="Bohr", basis="sto-3g", spin=1, verbose=0)
    first = fitting.Fitting(mole, SET).build()
    fitting.Fitting(small, SET).build()
    assert fitting.Fitting(mole.copy(), SET).build()._cderi is first._cderi


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
