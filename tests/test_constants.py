"""Constants against SciPy's table of CODATA 2022 and against printed digits."""

from __future__ import annotations

import math

import pytest
import scipy.constants
from hypothesis import given
from hypothesis import strategies as some
from scipy.constants import physical_constants

from unpaired import constants


@pytest.mark.parametrize(
    ("ours", "theirs"),
    [
        ("BOHR_MAGNETON_J_T", "Bohr magneton"),
        ("NUCLEAR_MAGNETON_J_T", "nuclear magneton"),
        ("PLANCK_J_S", "Planck constant"),
        ("BOHR_RADIUS_M", "Bohr radius"),
        ("VACUUM_PERMEABILITY", "vacuum mag. permeability"),
        ("HARTREE_J", "Hartree energy"),
        ("BOLTZMANN_J_K", "Boltzmann constant"),
        ("LIGHT_SPEED_M_S", "speed of light in vacuum"),
        ("AVOGADRO", "Avogadro constant"),
        ("ATOMIC_MASS_KG", "atomic mass constant"),
        ("ELECTRON_MASS_KG", "electron mass"),
    ],
)
def test_base_constants_are_those_of_scipy(ours: str, theirs: str) -> None:
    """SciPy 1.15 and later carry CODATA 2022; equal to the last digit."""
    assert getattr(constants, ours) == physical_constants[theirs][0]


def test_electron_g_is_the_magnitude() -> None:
    assert -physical_constants["electron g factor"][0] == constants.ELECTRON_G


def test_scipy_carries_the_same_edition() -> None:
    """The Bohr radius of CODATA 2022; that of 2018 ends in ...10903."""
    assert scipy.constants.value("Bohr radius") == 5.29177210544e-11
    assert constants.CODATA_EDITION == "CODATA 2022"


@pytest.mark.parametrize(
    ("computed", "printed", "digits"),
    [
        # Physics notes, section 1 (computed there from CODATA 2022) and design, section 7.
        (constants.BOHR_MAGNETON_MHZ_T, 13996.2449171, 7),
        (constants.NUCLEAR_MAGNETON_MHZ_T, 7.6225932188, 10),
        (constants.MHZ_PER_MT, 28.0249513861, 9),  # mu_B in J/T has 11 digits: no tenth decimal from it
        (constants.CONTACT_MHZ, 800.2374068, 7),
        (constants.DIPOLAR_MHZ, 95.5213042, 7),
        # NIST, CODATA 2022, from memory: hartree in cm^-1 and kJ/mol.
        (constants.HARTREE_CM, 219474.631363, 5),
        (constants.HARTREE_KJ_MOL, 2625.4996, 3),
        (constants.DALTON_ELECTRON_MASSES, 1822.888486, 5),
    ],
)
def test_derived_factors_have_the_printed_digits(computed: float, printed: float, digits: int) -> None:
    assert computed == pytest.approx(printed, abs=0.6 * 10**-digits, rel=0)


def test_hartree_over_kelvin_is_that_of_scipy() -> None:
    assert pytest.approx(physical_constants["kelvin-hartree relationship"][0], rel=1e-11) == (
        constants.BOLTZMANN_EH_K
    )


def test_contact_and_dipolar_factor_differ_by_eight_pi_thirds() -> None:
    """Physics notes, section 1."""
    assert pytest.approx(8 * math.pi / 3, rel=1e-14) == constants.CONTACT_MHZ / constants.DIPOLAR_MHZ


def test_a_free_electron_resonates_at_about_28_MHz_per_mT() -> None:
    """Common practice."""
    assert pytest.approx(28.0, abs=0.05) == constants.MHZ_PER_MT


_DENSITY = some.floats(-1e3, 1e3)


@given(_DENSITY, some.floats(-6, 6), some.integers(2, 8))
def test_a_coupling_flips_with_the_spins_and_is_shared_by_the_unpaired_electrons(
    density: float, nuclear_g: float, multiplicity: int
) -> None:
    coupling = constants.contact_coupling_MHz(density, nuclear_g, multiplicity)
    assert constants.contact_coupling_MHz(-density, nuclear_g, multiplicity) == -coupling
    doublet = constants.contact_coupling_MHz(density, nuclear_g, 2)
    assert coupling * (multiplicity - 1) == pytest.approx(doublet, rel=1e-14)


@given(some.floats(-1e4, 1e4))
def test_units_go_there_and_back(coupling_MHz: float) -> None:
    assert constants.mT_from_MHz(coupling_MHz) * constants.MHZ_PER_MT == pytest.approx(
        coupling_MHz, rel=1e-14
    )
