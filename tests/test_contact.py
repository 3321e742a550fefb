"""Spin density at the nuclei."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from unpaired.constants import contact_coupling_MHz
from unpaired.properties.contact import spin_density_at_nuclei


def test_contact_of_one_gaussian_is_exact():
    """A normalised s-type Gaussian has (2a/pi)^(3/2) at its centre and exp(-2 a R^2) of that at R."""
    exponent, distance = 0.7, 1.3
    norm = (2 * exponent / np.pi) ** 0.75
    values = norm * np.array([[1.0], [np.exp(-exponent * distance**2)]])
    found = spin_density_at_nuclei(np.array([[1.0]]), values)
    assert found == pytest.approx(norm**2 * np.array([1.0, np.exp(-2 * exponent * distance**2)]), rel=1e-14)


def test_contact_of_the_hydrogen_atom():
    """rho = Z^3/pi gives 1422.80758 MHz for the proton at infinite mass with g_e (exact, CODATA 2022)."""
    proton_g = 2 * 2.792847351
    density = spin_density_at_nuclei(np.array([[1.0]]), np.array([[np.pi**-0.5]]))
    assert contact_coupling_MHz(density[0], proton_g, 2) == pytest.approx(1422.80758, abs=2e-3)


@given(st.integers(0, 2**32 - 1), st.floats(-3, 3))
def test_contact_is_linear_and_changes_sign_with_the_spins(seed, factor):
    draw = np.random.default_rng(seed)
    matrix, values = draw.normal(size=(5, 5)), draw.normal(size=(3, 5))
    once = spin_density_at_nuclei(matrix, values)
    assert spin_density_at_nuclei(factor * matrix, values) == pytest.approx(factor * once, abs=1e-12)
    assert spin_density_at_nuclei(-matrix, values) == pytest.approx(-once, abs=1e-12)
