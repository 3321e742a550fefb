"""Stale numbers are never served: if the engine's numbers change, ENGINE_VERSION must.

`tests/pinned/engine-N.json` holds the couplings of a small case for version N. After a wanted change, raise
ENGINE_VERSION in electronic/settings.py and write the new file with

    python tests/test_engine_version.py
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from unpaired.constants import BOHR_ANGSTROM
from unpaired.electronic.settings import ENGINE_VERSION
from unpaired.electronic.solve import solve
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point, Solvent
from unpaired.properties.contact import spin_density_at_nuclei

FILE = Path(__file__).parent / "pinned" / f"engine-{ENGINE_VERSION}.json"
AMIDOGEN = Molecule(
    ("N", "H", "H"),
    np.array([[0.0, 0.0, 0.0], [0.0, 0.80, 0.60], [0.0, -0.80, 0.60]]) / BOHR_ANGSTROM,
    0,
    2,
)
CASES = {
    "UHF": Point(AMIDOGEN, Level("UHF", "pcH-1")),
    "ROHF": Point(AMIDOGEN, Level("ROHF", "pcH-1")),
    "UKS": Point(AMIDOGEN, Level("UKS", "pcH-1", "B3LYP")),
    "UKS quick": Point(AMIDOGEN, Level("UKS", "pcH-1", "B3LYP", accuracy="quick")),
    "UHF in water": Point(AMIDOGEN, Level("UHF", "pcH-1"), Solvent("water", 78.4)),
}


def numbers(name: str) -> dict[str, object]:
    """Energy and spin densities at the nuclei."""
    state = solve(CASES[name])
    density = spin_density_at_nuclei(state.solution.spin_density_matrix, state.ao_at_nuclei)
    return {"energy_Eh": state.energy_Eh, "spin_density_au": density.tolist()}


@pytest.mark.parametrize("name", CASES)
def test_numbers_change_only_with_the_engine_version(name: str) -> None:
    """1e-7 Eh and 2e-6 bohr^-3 (3e-4 mT for a proton): what another BLAS or thread count may change."""
    pinned = json.loads(FILE.read_text())[name]
    found = numbers(name)
    assert found["energy_Eh"] == pytest.approx(pinned["energy_Eh"], abs=1e-7)
    assert found["spin_density_au"] == pytest.approx(pinned["spin_density_au"], abs=2e-6)


if __name__ == "__main__":
    FILE.write_text(json.dumps({name: numbers(name) for name in CASES}, indent=1) + "\n")
