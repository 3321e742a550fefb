"""Physical constants: CODATA 2022, and the factors derived from them as expressions.

Source: E. Tiesinga, P. J. Mohr, D. B. Newell, B. N. Taylor, "CODATA recommended values of the fundamental
physical constants: 2022", NIST, https://physics.nist.gov/constants. A test compares every base constant with
SciPy's table of the same edition.
"""

from __future__ import annotations

import math

CODATA_EDITION = "CODATA 2022"

# Base constants, SI.
ELECTRON_G = 2.00231930436092  # |g_e|
BOHR_MAGNETON_J_T = 9.2740100657e-24
NUCLEAR_MAGNETON_J_T = 5.0507837393e-27
PLANCK_J_S = 6.62607015e-34
BOHR_RADIUS_M = 5.29177210544e-11
VACUUM_PERMEABILITY = 1.25663706127e-6  # N A^-2
HARTREE_J = 4.3597447222060e-18
BOLTZMANN_J_K = 1.380649e-23
LIGHT_SPEED_M_S = 299792458.0
AVOGADRO = 6.02214076e23
ATOMIC_MASS_KG = 1.66053906892e-27
ELECTRON_MASS_KG = 9.1093837139e-31

# Derived.
BOHR_ANGSTROM = BOHR_RADIUS_M * 1e10
BOHR_MAGNETON_MHZ_T = BOHR_MAGNETON_J_T / PLANCK_J_S * 1e-6
NUCLEAR_MAGNETON_MHZ_T = NUCLEAR_MAGNETON_J_T / PLANCK_J_S * 1e-6
MHZ_PER_MT = ELECTRON_G * BOHR_MAGNETON_MHZ_T * 1e-3
"""One mT of field splitting at g_e in MHz: 28.0249514."""

CONTACT_MHZ = (
    (2.0 / 3.0)
    * VACUUM_PERMEABILITY
    * ELECTRON_G
    * BOHR_MAGNETON_J_T
    * NUCLEAR_MAGNETON_J_T
    / (PLANCK_J_S * BOHR_RADIUS_M**3)
    * 1e-6
)
"""a_iso[MHz] = CONTACT_MHZ * g_N * spin density[bohr^-3] / (2S): 800.2374."""

DIPOLAR_MHZ = CONTACT_MHZ * 3.0 / (8.0 * math.pi)
"""T[MHz] = DIPOLAR_MHZ * g_N / (2S) * <(3 r r - r^2)/r^5>[bohr^-3]: 95.5213."""

HARTREE_KJ_MOL = HARTREE_J * AVOGADRO * 1e-3
HARTREE_CM = HARTREE_J / (PLANCK_J_S * LIGHT_SPEED_M_S) * 1e-2
BOLTZMANN_EH_K = BOLTZMANN_J_K / HARTREE_J
DALTON_ELECTRON_MASSES = ATOMIC_MASS_KG / ELECTRON_MASS_KG


def contact_coupling_MHz(spin_density_au: float, nuclear_g: float, multiplicity: int) -> float:
    """Isotropic coupling in MHz from the spin density at the nucleus (bohr^-3, for M_S = S).

    a_iso = (2/3) mu_0 g_e mu_B g_N mu_N rho(0) / (h a_0^3 2S), first order and non-relativistic.
    """
    return CONTACT_MHZ * nuclear_g * spin_density_au / (multiplicity - 1)


def mT_from_MHz(coupling_MHz: float) -> float:
    """Coupling in mT at g_e from a coupling in MHz."""
    return coupling_MHz / MHZ_PER_MT
