"""Our sums on the grid against the library's own, on the same grid."""

import numpy as np
import pytest
from numpy.typing import NDArray
from pyscf import dft, gto, lib

from unpaired.electronic import grid
from unpaired.electronic.frame import turned_grids

FUNCTIONALS = ["LDA,VWN", "PBE", "B3LYP", "TPSSh"]


@pytest.fixture(scope="module")
def mole() -> gto.Mole:
    return gto.M(atom="C 0 0 0; O 0 0 2.2; H 1.8 0 -0.9", unit="Bohr", basis="6-31G*", spin=1, verbose=0)


@pytest.fixture(scope="module")
def points(mole: gto.Mole) -> dft.gen_grid.Grids:
    points = dft.gen_grid.Grids(mole)
    points.level = 0
    return points.build(with_non0tab=True)


@pytest.fixture(scope="module")
def densities(mole: gto.Mole) -> NDArray[np.float64]:
    """Alpha and beta densities of the library's first guess's orbitals, with the orbitals attached."""
    field = dft.UKS(mole)
    orbitals = field.eig(field.get_fock(dm=np.asarray(field.get_init_guess()), cycle=-1), field.get_ovlp())[1]
    occupations = np.zeros((2, mole.nao))
    for k, electrons in enumerate(mole.nelec):
        occupations[k, :electrons] = 1
    return field.make_rdm1(orbitals, occupations)


@pytest.mark.parametrize("functional", FUNCTIONALS)
@pytest.mark.parametrize("carries_orbitals", [True, False])
def test_potential_is_the_librarys(mole, points, densities, functional, carries_orbitals):
    given = densities if carries_orbitals else np.array(densities)
    electrons, energy, matrices = grid.GridIntegration().nr_uks(mole, points, functional, given)
    expected = dft.numint.NumInt().nr_uks(mole, points, functional, densities)
    np.testing.assert_allclose(electrons, expected[0], atol=1e-8)
    assert energy == pytest.approx(expected[1], abs=1e-8)
    np.testing.assert_allclose(matrices, expected[2], atol=1e-7)


@pytest.mark.parametrize("functional", FUNCTIONALS)
@pytest.mark.parametrize("sets", [None, 1, 3])
def test_response_is_the_librarys(mole, points, densities, functional, sets):
    shape = (2, mole.nao, mole.nao) if sets is None else (2, sets, mole.nao, mole.nao)
    change = np.random.default_rng(5).normal(size=shape)
    change = change + change.swapaxes(-1, -2)
    answers = []
    for numint in (grid.GridIntegration(), dft.numint.NumInt()):
        kernel = numint.cache_xc_kernel(
            mole, points, functional, densities.mo_coeff, densities.mo_occ, spin=1
        )
        answers.append(numint.nr_uks_fxc(mole, points, functional, None, change, 0, 1, *kernel))
    np.testing.assert_allclose(answers[0], answers[1], rtol=1e-6, atol=1e-6)


def test_a_functional_gives_its_potential_as_derivative(mole, points, densities):
    """(E(D + h X) - E(D - h X)) / 2h = tr V X for any symmetric X: no other program needed."""
    numint = grid.GridIntegration()
    change = np.random.default_rng(1).normal(size=(2, mole.nao, mole.nao)) / mole.nao
    change = change + change.swapaxes(1, 2)
    dm, step = np.array(densities), 1e-5
    ends = [numint.nr_uks(mole, points, "TPSSh", dm + sign * step * change)[1] for sign in (1, -1)]
    potential = numint.nr_uks(mole, points, "TPSSh", dm)[2]
    assert (ends[0] - ends[1]) / (2 * step) == pytest.approx(np.sum(potential * change), rel=1e-6)


def test_values_that_are_not_kept_give_the_same(mole, points, densities, monkeypatch):
    kept = grid.GridIntegration().nr_uks(mole, points, "B3LYP", densities)
    monkeypatch.setattr(grid, "KEPT_MB", 0.0)
    integration = grid.GridIntegration()
    anew = integration.nr_uks(mole, points, "B3LYP", densities)
    assert all(block.kept is None for block in integration.blocks(mole, points, "GGA").blocks)
    np.testing.assert_array_equal(anew[2], kept[2])


def test_threads_change_nothing_but_rounding(mole, points, densities):
    answers = []
    before = lib.num_threads()
    try:
        for threads in (1, 2):
            lib.num_threads(threads)
            answers.append(grid.GridIntegration().nr_uks(mole, points, "B3LYP", densities)[2])
    finally:
        lib.num_threads(before)
    np.testing.assert_allclose(answers[0], answers[1], atol=1e-11)


def test_another_grid_is_not_served_the_first_ones_values(mole, points, densities):
    integration = grid.GridIntegration()
    integration.nr_uks(mole, points, "B3LYP", densities)
    finer = dft.gen_grid.Grids(mole)
    finer.level = 1
    finer.build(with_non0tab=True)
    ours = integration.nr_uks(mole, finer, "B3LYP", densities)[1]
    assert ours == pytest.approx(dft.numint.NumInt().nr_uks(mole, finer, "B3LYP", densities)[1], abs=1e-8)


@pytest.mark.parametrize("functional", FUNCTIONALS)
@pytest.mark.parametrize("change", [0.0, 1e-3, 0.5])
def test_potential_after_an_earlier_one_is_the_librarys(mole, points, densities, functional, change):
    """A small change is added in single precision, a large one made anew."""
    mixed = np.array(densities) * (1 + change)
    ours = grid.GridIntegration()
    ours.nr_uks(mole, points, functional, densities)
    found = ours.nr_uks(mole, points, functional, mixed)
    expected = dft.numint.NumInt().nr_uks(mole, points, functional, mixed)
    assert found[1] == pytest.approx(expected[1], abs=1e-8)
    np.testing.assert_allclose(found[2], expected[2], atol=1e-7)


def test_caller_may_change_a_matrix_that_later_ones_are_made_from(mole, points, densities):
    ours = grid.GridIntegration()
    first = ours.nr_uks(mole, points, "PBE", densities)[2]
    before = first.copy()
    first *= 2
    np.testing.assert_allclose(ours.nr_uks(mole, points, "PBE", densities)[2], before, atol=1e-12)


@pytest.mark.parametrize("functional", FUNCTIONALS)
def test_rough_grids_are_summed_in_single_precision(mole, densities, functional):
    exact, single = (
        grid.GridIntegration().nr_uks(mole, turned_grids(mole, 0, wanted), functional, densities)
        for wanted in (False, True)
    )
    assert 1e-12 < np.abs(exact[2] - single[2]).max() < 1e-4
    assert single[1] == pytest.approx(exact[1], abs=1e-4)
