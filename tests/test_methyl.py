"""Planar CH3, R(CH) = 1.079 A, against couplings computed independently of this project (0.3 %).

The reference set was converged to 1e-10 Eh with exact integrals on grid level 4, so `accuracy: reference`.
"""

from __future__ import annotations

import numpy as np
import pytest

from unpaired.constants import BOHR_ANGSTROM, contact_coupling_MHz
from unpaired.electronic.solve import solve
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.nuclei import isotope
from unpaired.point import Point
from unpaired.properties.contact import spin_density_at_nuclei

ANGLES = np.deg2rad([0.0, 120.0, 240.0])
METHYL = Molecule(
    ("C", "H", "H", "H"),
    np.vstack([np.zeros(3), 1.079 * np.c_[np.cos(ANGLES), np.sin(ANGLES), np.zeros(3)]]) / BOHR_ANGSTROM,
    0,
    2,
)


def couplings_MHz(level: Level) -> tuple[float, float, float]:
    """13C, 1H in MHz and <S^2>."""
    state = solve(Point(METHYL, level))
    density = spin_density_at_nuclei(state.solution.spin_density_matrix, state.ao_at_nuclei)
    carbon, proton = isotope("13C").nuclear_g, isotope("1H").nuclear_g
    return (
        contact_coupling_MHz(density[0], carbon, 2),
        contact_coupling_MHz(density[1:].mean(), proton, 2),
        state.s_squared,
    )


@pytest.mark.slow
@pytest.mark.parametrize(
    ("scf", "functional", "basis", "carbon_MHz", "proton_MHz", "s_squared"),
    [
        ("UHF", None, "pcH-2", 165.60, -123.03, 0.7615),
        ("UKS", "B3LYP", "pcH-2", 83.70, -64.70, 0.7535),
        ("UKS", "B3LYP", "pcH-1", 91.4, -66.27, None),
    ],
)
def test_methyl_reference_set(scf, functional, basis, carbon_MHz, proton_MHz, s_squared) -> None:
    found = couplings_MHz(Level(scf, basis, functional, accuracy="reference"))
    assert found[:2] == pytest.approx((carbon_MHz, proton_MHz), rel=3e-3)
    if s_squared is not None:
        assert found[2] == pytest.approx(s_squared, abs=1e-4)


def test_methyl_restricted_open_is_zero() -> None:
    """Every nucleus lies in the nodal plane of the singly occupied orbital (exact)."""
    assert couplings_MHz(Level("ROHF", "pcH-1"))[:2] == pytest.approx((0.0, 0.0), abs=1e-6)
