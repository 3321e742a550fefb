"""The orbital Hessian against finite differences of the energy, and the lowest root against dense algebra."""

import numpy as np
import pytest

from unpaired.electronic.curvature import curvature
from unpaired.electronic.stability import lowest_root

WATER_CATION = [("O", (0, 0, 0)), ("H", (0, 0.2, 1.8)), ("H", (0, 1.7, -0.5))]


def converged(kind: str, functional: str | None, continuum: bool):
    from pyscf import dft, gto, scf

    mole = gto.M(atom=WATER_CATION, unit="Bohr", basis="6-31g", charge=1, spin=1, verbose=0)
    field = getattr(dft if functional else scf, kind)(mole)
    if functional:
        field.xc, field.grids.level = functional, 2
    if continuum:
        field = field.PCM()
        field.with_solvent.method, field.with_solvent.eps = "IEF-PCM", 78.4
    field.conv_tol, field.conv_tol_grad = 1e-12, 1e-7
    field.kernel()
    assert field.converged
    return field


@pytest.mark.parametrize(
    ("kind", "functional", "continuum"),
    [
        ("UHF", None, False),
        ("ROHF", None, False),
        ("UKS", "b3lyp", False),
        ("ROKS", "pbe", False),
        ("UHF", None, True),
        ("ROHF", None, True),
    ],
)
def test_curvature_is_the_second_derivative_of_the_energy(kind, functional, continuum):
    """Independent brute force: five-point second difference of the energy along a rotation."""
    field = converged(kind, functional, continuum)
    hessian = curvature(field, response_grid=None)
    direction = np.cos(1.0 + np.arange(len(hessian.diagonal)) ** 1.5)
    direction /= np.linalg.norm(direction)

    def energy(step: float) -> float:
        return field.energy_tot(field.make_rdm1(hessian.rotated(step * direction), field.mo_occ))

    def difference(step: float) -> float:
        return (energy(step) + energy(-step) - 2 * energy(0.0)) / (2 * step**2)

    expected = (4 * difference(0.01) - difference(0.02)) / 3
    found = float(direction @ hessian.product(direction[None])[0])
    assert found == pytest.approx(expected, abs=1e-5)


def test_gradient_vanishes_where_the_field_is_converged():
    assert np.abs(curvature(converged("ROHF", None, False)).gradient).max() < 1e-6


def test_lowest_root_is_found_behind_a_symmetry_block():
    """Dense eigenvalues are the reference; the lowest one lives in a block that no diagonal element betrays."""
    draw = np.random.default_rng(3)
    first, second = (a + a.T for a in (0.02 * draw.standard_normal((2, 60, 60))))
    matrix = np.block([[first, np.zeros((60, 60))], [np.zeros((60, 60)), second]])
    matrix += np.diag(np.concatenate([np.linspace(0.3, 2, 60), np.linspace(0.8, 3, 60)]))
    matrix[60:62, 60:62] = [[0.9, -1.2], [-1.2, 0.9]]
    value, vector = lowest_root(lambda x: x @ matrix, np.diag(matrix).copy(), 1e-4)
    values, vectors = np.linalg.eigh(matrix)
    assert value == pytest.approx(values[0], abs=1e-6)
    assert abs(vector @ vectors[:, 0]) == pytest.approx(1, abs=1e-4)
