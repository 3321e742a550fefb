"""Dipolar tensors against exact values, laws, and numerical quadrature."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from unpaired.constants import DIPOLAR_MHZ
from unpaired.electronic.integrals import field_gradients
from unpaired.electronic.mole import build_mole
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point
from unpaired.properties.dipolar import dipolar_tensor_MHz, principal

PROTON_G = 2 * 2.792847351  # Stone, INDC(NDS)-0794 (2019)


def point(elements, coordinates_bohr, multiplicity=2, basis="6-31G"):
    return Point(Molecule(tuple(elements), np.array(coordinates_bohr), 0, multiplicity), Level("UHF", basis))


@pytest.fixture
def one_p_function(monkeypatch):
    """Atoms whose only basis functions are the p-type Gaussians of exponent 0.8."""
    from unpaired import catalogue

    monkeypatch.setattr(catalogue, "basis_for", lambda name, element: [[1, [0.8, 1.0]]])


def test_one_electron_in_a_p_type_gaussian(one_p_function):
    """Exact: <r^-3> = 8 sqrt2 a^1.5/(3 sqrt pi), T_zz = (4/5) 95.5213 g_N <r^-3>, T_xx = T_yy = -T_zz/2."""
    where = point(["H"], [[0, 0, 0]])
    tensor = dipolar_tensor_MHz(field_gradients(where, np.diag([0.0, 0.0, 1.0]))[0], PROTON_G, 2)
    inverse_cube = 8 * np.sqrt(2) * 0.8**1.5 / (3 * np.sqrt(np.pi))
    along = 0.8 * DIPOLAR_MHZ * PROTON_G * inverse_cube
    assert tensor == pytest.approx(np.diag([-along / 2, -along / 2, along]), rel=1e-10, abs=1e-9)


def test_a_distant_spin_is_a_point_dipole(monkeypatch):
    """Exact: an s-type spin density acts as a point dipole; 1H at 10 A: 158.1/1000 MHz along the axis."""
    from unpaired import catalogue

    monkeypatch.setattr(catalogue, "basis_for", lambda name, element: [[0, [0.8, 1.0]]])
    distance = 10 / 0.529177210544
    where = point(["H", "H"], [[0, 0, 0], [0, 0, distance]], multiplicity=3)
    tensor = dipolar_tensor_MHz(field_gradients(where, np.diag([1.0, 0.0]))[1], PROTON_G, 2)
    assert tensor == pytest.approx(np.diag([-0.07906, -0.07906, 0.1581]), abs=5e-5)
    exact = DIPOLAR_MHZ * PROTON_G / distance**3
    assert tensor == pytest.approx(np.diag([-exact, -exact, 2 * exact]), rel=1e-9, abs=1e-12)


def water_like(turn=None):
    coordinates = np.array([[0.1, 0.2, -0.3], [1.6, 0.5, 0.4], [-0.9, 1.3, 1.1]])
    return point(["O", "H", "H"], coordinates if turn is None else coordinates @ turn.T, multiplicity=3)


def some_density(where, seed=0):
    """A smooth spin density: products of valence functions that decay fast enough for a modest grid."""
    functions = build_mole(where).nao
    matrix = np.random.default_rng(seed).normal(size=(functions, functions))
    return matrix + matrix.T


def test_tensors_are_symmetric_and_traceless():
    where = water_like()
    found = field_gradients(where, some_density(where))
    assert found == pytest.approx(found.transpose(0, 2, 1), abs=1e-12)
    assert np.trace(found, axis1=1, axis2=2) == pytest.approx(np.zeros(3), abs=1e-9)


def test_tensors_equal_quadrature_on_an_atom_centred_grid():
    """Independent brute force: rho(r) (3 r_i r_j - delta r^2)/r^5 summed on PySCF's Becke grid, level 6.

    Around a nucleus the integrand is an s-like density times r^-3, which the angular grid integrates to zero.
    """
    from pyscf import dft

    where = water_like()
    matrix = some_density(where, 3)
    mole = build_mole(where)
    grid = dft.gen_grid.Grids(mole)
    grid.level, grid.prune = 6, None
    grid.build()
    values = mole.eval_gto("GTOval", grid.coords)
    weighted = np.einsum("pm,mn,pn->p", values, matrix, values, optimize=True) * grid.weights
    exact = field_gradients(where, matrix)
    for atom in range(3):
        r = grid.coords - mole.atom_coord(atom)
        inverse = np.linalg.norm(r, axis=1) ** -1.0
        tensor = 3 * np.einsum("p,pi,pj->ij", weighted * inverse**5, r, r)
        tensor -= np.eye(3) * (weighted @ inverse**3)
        assert tensor == pytest.approx(exact[atom], abs=2e-3 * np.abs(exact[atom]).max())


@pytest.mark.parametrize("seed", [1, 2])
def test_turning_the_molecule_turns_the_tensor(seed):
    """A turned molecule has the turned tensor; s- and p-functions are turned with it."""
    turn = np.linalg.qr(np.random.default_rng(seed).normal(size=(3, 3)))[0]
    here, there = water_like(), water_like(turn)
    matrix = some_density(here)
    mole = build_mole(here)
    place = {"": None, "x": 0, "y": 1, "z": 2}
    labels = mole.ao_labels(fmt=False)
    basis_turn = np.zeros((mole.nao, mole.nao))
    for i, one in enumerate(labels):
        for j, other in enumerate(labels):
            if one[0] == other[0] and one[2] == other[2]:
                a, b = place[one[3]], place[other[3]]
                basis_turn[i, j] = 1.0 if a is None else turn[a, b]
    turned = field_gradients(there, basis_turn @ matrix @ basis_turn.T)
    assert turned == pytest.approx(turn @ field_gradients(here, matrix) @ turn.T, abs=1e-9)


@given(st.integers(0, 10**6))
def test_principal_values_and_axes_rebuild_the_tensor(seed):
    matrix = np.random.default_rng(seed).normal(size=(3, 3))
    tensor = matrix + matrix.T - np.trace(matrix) * 2 / 3 * np.eye(3)
    values, axes = principal(tensor)
    assert list(values) == sorted(values)
    assert axes.T @ np.diag(values) @ axes == pytest.approx(tensor, abs=1e-10)
    assert np.linalg.det(axes) == pytest.approx(1)
