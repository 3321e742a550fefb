"""Laws that hold whatever the molecule: motion of the whole, order of atoms, exchange of spins, units, records."""

from __future__ import annotations

import dataclasses
import json

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from samples import result, state
from scipy.constants import physical_constants
from scipy.spatial.transform import Rotation

from unpaired import constants, nuclei
from unpaired.electronic.solve import solve
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point
from unpaired.properties.contact import spin_density_at_nuclei
from unpaired.result import Result
from unpaired.state import State

AMIDOGEN = Molecule(("N", "H", "H"), np.array([[0.0, 0.0, 0.0], [0.0, 1.51, 1.13], [0.0, -1.51, 1.13]]), 0, 2)


def contact_mT(found: State, molecule: Molecule) -> np.ndarray:
    """Couplings of every nucleus."""
    density = spin_density_at_nuclei(found.solution.spin_density_matrix, found.ao_at_nuclei)
    moments = [nuclei.table_isotope(element).nuclear_g for element in molecule.elements]
    return np.array(
        [
            constants.mT_from_MHz(constants.contact_coupling_MHz(value, moment, molecule.multiplicity))
            for value, moment in zip(density, moments, strict=True)
        ]
    )


@pytest.fixture(scope="module")
def amidogen() -> dict[str, State]:
    return {scf: solve(Point(AMIDOGEN, level(scf))) for scf in ("UHF", "UKS")}


def level(scf: str) -> Level:
    return Level(scf, "pcH-1", "B3LYP" if scf == "UKS" else None)


@pytest.mark.parametrize("scf", ["UHF", "UKS"])
@settings(max_examples=3, deadline=None)
@given(seed=st.integers(0, 2**32 - 1))
def test_moving_and_reordering_the_molecule_changes_nothing(amidogen, scf: str, seed: int) -> None:
    random = np.random.default_rng(seed)
    order = random.permutation(3)
    moved = Molecule(
        tuple(AMIDOGEN.elements[place] for place in order),
        AMIDOGEN.coordinates_bohr[order] @ Rotation.random(rng=random).as_matrix().T + random.normal(size=3),
        0,
        2,
    )
    found = solve(Point(moved, level(scf)))
    assert found.energy_Eh == pytest.approx(amidogen[scf].energy_Eh, abs=1e-6)
    assert contact_mT(found, moved) == pytest.approx(contact_mT(amidogen[scf], AMIDOGEN)[order], abs=0.002)


@given(seed=st.integers(0, 2**32 - 1))
def test_swapping_alpha_and_beta_flips_every_sign(seed: int) -> None:
    one = state(seed).solution
    other = dataclasses.replace(one, orbitals=one.orbitals[::-1], occupations=one.occupations[::-1])
    values = state(seed).ao_at_nuclei
    assert spin_density_at_nuclei(other.spin_density_matrix, values) == pytest.approx(
        -spin_density_at_nuclei(one.spin_density_matrix, values), abs=1e-12
    )


@given(field_mT=st.floats(-1e6, 1e6))
def test_one_mT_is_the_free_electron_resonance_of_one_mT(field_mT: float) -> None:
    """h nu = g_e mu_B B with SciPy's constants, an independent table of the same edition."""
    per_tesla_Hz = (
        abs(physical_constants["electron g factor"][0]) * physical_constants["Bohr magneton in Hz/T"][0]
    )
    assert constants.mT_from_MHz(per_tesla_Hz * field_mT * 1e-9) == pytest.approx(field_mT, rel=1e-9)


PLAIN = st.one_of(
    st.none(), st.booleans(), st.floats(allow_nan=False, allow_infinity=False), st.text(max_size=5)
)


@given(value=st.floats(allow_nan=False, allow_infinity=False), detail=PLAIN)
def test_a_record_written_and_read_is_the_same(value: float, detail: object) -> None:
    whole = result()
    row = dict(whole.tables["couplings"][0]) | {"a_iso_MHz": value}
    whole = dataclasses.replace(
        whole, tables={**whole.tables, "couplings": (row,)}, details={"UHF/pcH-1": {"x": detail}}
    )
    first = Result.from_dict(json.loads(json.dumps(whole.to_dict())))
    again = Result.from_dict(json.loads(json.dumps(first.to_dict())))
    assert again.to_dict() == first.to_dict()
    assert again.rows("couplings")[0]["a_iso_MHz"] == value
    assert again.details["UHF/pcH-1"]["x"] == detail
