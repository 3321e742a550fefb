"""The chain for one recipe, with a made-up engine: rows, groups, flags, failures."""

from __future__ import annotations

import dataclasses
from pathlib import Path

import numpy as np
import pytest

from unpaired import columns
from unpaired.constants import CONTACT_MHZ, MHZ_PER_MT
from unpaired.electronic.mole import build_mole
from unpaired.errors import ConvergenceError
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.nuclei import isotope
from unpaired.point import Point
from unpaired.recipe.recipe import Recipe
from unpaired.settled import Conformer, Settled
from unpaired.state import Solution, State
from unpaired.study import assemble, plan, study

ANGLES = np.deg2rad([0.0, 120.0, 240.0])
METHYL = Molecule(
    ("C", "H", "H", "H"),
    np.vstack([np.zeros(3), 2.04 * np.c_[np.cos(ANGLES), np.sin(ANGLES), np.zeros(3)]]),
    0,
    2,
)
RECIPE = Recipe(
    radical="methyl",
    path=Path("methyl.yaml"),
    structure="methyl.xyz",
    smiles=None,
    molecule=METHYL,
    charge=0,
    multiplicity=2,
    levels=(Level("UHF", "pcH-1"), Level("UKS", "pcH-1", "B3LYP")),
)


def engine(
    densities: tuple[float, ...] = (0.2, -0.1, -0.1, -0.1), s_squared: float = 0.755, degenerate: str = ""
):
    """A solve whose spin density at the nuclei is what is asked: one singly occupied function per atom.

    Every basis function is one at its own nucleus, so alpha holds the positive and beta the negative parts.
    """

    def solve(point: Point, report: object = None) -> State:
        functions, atoms = build_mole(point).nao, len(densities)
        values = np.zeros(functions)
        values[:atoms] = densities
        orbitals = np.stack(
            [np.diag(np.sqrt(np.maximum(values, 0))), np.diag(np.sqrt(np.maximum(-values, 0)))]
        )
        solution = Solution(
            energy_Eh=-39.5,
            s_squared=s_squared,
            stable=None,
            label="",
            origin="made up",
            orbitals=orbitals,
            occupations=np.tile(np.arange(functions) < atoms, (2, 1)).astype(float),
            orbital_energies_Eh=np.zeros((2, functions)),
        )
        ones = np.eye(functions)
        return State((solution,), 0, ones, ones[:atoms], 9, 0.5, engine={"degenerate": degenerate or None})

    return solve


def with_levels(*levels: Level) -> Recipe:
    return dataclasses.replace(RECIPE, levels=levels)


def test_one_row_per_level_and_nucleus_with_every_column() -> None:
    rows = study(RECIPE, engine()).rows("couplings")
    assert [(row["level"], row["atom"]) for row in rows] == [
        (level, atom) for level in ("UHF/pcH-1", "UKS-B3LYP/pcH-1") for atom in ("C1", "H2", "H3", "H4")
    ]
    assert all(tuple(row) == columns.names("couplings") for row in rows)


def test_a_coupling_is_the_formula_with_its_sign() -> None:
    carbon, proton = study(RECIPE, engine()).rows("couplings")[:2]
    assert carbon["a_iso_MHz"] == pytest.approx(CONTACT_MHZ * isotope("13C").nuclear_g * 0.2)
    assert proton["a_iso_mT"] == pytest.approx(-CONTACT_MHZ * isotope("1H").nuclear_g * 0.1 / MHZ_PER_MT)


def test_a_group_carries_the_mean() -> None:
    rows = study(RECIPE, engine((0.2, -0.08, -0.1, -0.12))).rows("couplings")[1:4]
    assert [row["group"] for row in rows] == ["H2", "H2", "H2"]
    assert [row["group_size"] for row in rows] == [3, 3, 3]
    assert [row["a_group_mT"] for row in rows] == pytest.approx([rows[1]["a_iso_mT"]] * 3)


def test_a_named_isotope_scales_by_its_moment_and_leaves_the_group() -> None:
    rows = study(dataclasses.replace(RECIPE, isotopes={"H2": "2H"}), engine()).rows("couplings")[1:4]
    assert [row["isotope"] for row in rows] == ["2H", "1H", "1H"]
    assert rows[0]["a_iso_MHz"] / rows[1]["a_iso_MHz"] == pytest.approx(
        isotope("2H").nuclear_g / isotope("1H").nuclear_g
    )


def test_a_deuteron_in_a_turning_methyl_visits_all_three_places() -> None:
    """CH2D: protons and deuteron see the same mean density, so their couplings differ by the moments alone."""
    mixed = dataclasses.replace(RECIPE, isotopes={"H2": "2H"})
    rows = study(mixed, engine((0.2, -0.08, -0.1, -0.12))).rows("couplings")[1:4]
    plain = study(RECIPE, engine((0.2, -0.08, -0.1, -0.12))).rows("couplings")[2]
    ratio = isotope("2H").nuclear_g / isotope("1H").nuclear_g
    assert rows[1]["a_group_mT"] == pytest.approx(plain["a_group_mT"])
    assert rows[0]["a_group_mT"] == pytest.approx(plain["a_group_mT"] * ratio)


def test_more_than_one_unpaired_electron_divides_by_their_number() -> None:
    triplet = dataclasses.replace(RECIPE, molecule=dataclasses.replace(METHYL, charge=1, multiplicity=3))
    doublet = study(RECIPE, engine()).rows("couplings")[0]
    assert study(triplet, engine()).rows("couplings")[0]["a_iso_MHz"] == pytest.approx(
        doublet["a_iso_MHz"] / 2
    )


def codes(recipe: Recipe = RECIPE, **options: object) -> set[tuple[str, str | None, str]]:
    return {
        (row["code"], row["atom"], row["severity"]) for row in study(recipe, engine(**options)).rows("flags")
    }


@pytest.mark.parametrize(
    ("scf", "functional", "s_squared", "severity"),
    [
        ("UHF", None, 0.80, "caution"),
        ("UHF", None, 0.90, "bad"),
        ("UKS", "B3LYP", 0.78, "caution"),
        ("UKS", "B3LYP", 0.81, "bad"),
    ],
)
def test_contamination_beyond_its_band_is_flagged(scf, functional, s_squared, severity) -> None:
    found = codes(with_levels(Level(scf, "pcH-1", functional)), s_squared=s_squared)
    assert ("contaminated", None, severity) in found


def test_the_limit_grows_with_the_spin() -> None:
    """Equal weight of the first contaminant, D/(2S+2), is equal severity."""
    quartet = dataclasses.replace(RECIPE, molecule=dataclasses.replace(METHYL, multiplicity=4))
    assert not any(code == "contaminated" for code, _, _ in codes(quartet, s_squared=3.75 + 0.03))
    assert any(code == "contaminated" for code, _, _ in codes(quartet, s_squared=3.75 + 0.035))


def test_uhf_is_said_to_exaggerate_even_when_clean() -> None:
    assert ("exaggerated-polarisation", None, "note") in codes(with_levels(Level("UHF", "pcH-1")))
    assert not any(
        code == "exaggerated-polarisation"
        for code, _, _ in codes(with_levels(Level("UKS", "pcH-1", "B3LYP")))
    )


def test_contamination_within_its_band_is_not_flagged() -> None:
    assert not any(code == "contaminated" for code, _, _ in codes(s_squared=0.769))


def test_equivalent_nuclei_that_differ_are_flagged_and_others_not() -> None:
    found = codes(with_levels(Level("UHF", "pcH-1")), densities=(0.2, -0.08, -0.1, -0.12))
    assert {atom for code, atom, _ in found if code == "symmetry-broken"} == {"H2", "H3", "H4"}
    assert not any(code == "symmetry-broken" for code, _, _ in codes())


def test_one_component_of_a_degenerate_state_is_no_broken_symmetry() -> None:
    found = codes(
        with_levels(Level("UHF", "pcH-1")), densities=(0.2, -0.08, -0.1, -0.12), degenerate="Jahn-Teller"
    )
    assert {(atom, severity) for code, atom, severity in found if code == "one-component"} == {
        ("H2", "caution"),
        ("H3", "caution"),
        ("H4", "caution"),
    }
    assert not any(code == "symmetry-broken" for code, _, _ in found)


def test_an_energy_basis_set_is_flagged_at_every_coupled_nucleus() -> None:
    found = codes(with_levels(Level("UHF", "cc-pVDZ")))
    assert {(atom, severity) for code, atom, severity in found if code == "contracted-basis"} == {
        ("C1", "bad"),
        ("H2", "caution"),
        ("H3", "caution"),
        ("H4", "caution"),
    }
    assert not any(code == "contracted-basis" for code, _, _ in codes())


def test_flags_stand_beside_the_numbers_that_they_spoil() -> None:
    result = study(with_levels(Level("UHF", "cc-pVDZ")), engine(s_squared=0.9))
    for table in ("states", "couplings"):
        assert result.rows(table)[0]["flags"].split(";")[:2] == ["contaminated", "contracted-basis"]


def test_a_failed_level_keeps_its_rows_with_the_reason() -> None:
    def solve(point: Point, report: object = None) -> State:
        if point.level.scf == "UHF":
            raise ConvergenceError("no state found")
        return engine()(point)

    result = study(RECIPE, solve)
    failed, fine = result.rows("states")
    assert (failed["converged"], failed["energy_Eh"], failed["flags"]) == (False, None, "not-converged")
    assert fine["converged"]
    assert [row["a_iso_mT"] for row in result.rows("couplings", "UHF/pcH-1")] == [None] * 4
    assert result.rows("flags")[0]["advice"].startswith("no state found; ")
    assert result.failed


def test_any_map_runs_the_points() -> None:
    seen = []

    def backwards(call, points):
        points = list(points)
        seen.extend(points)
        return reversed([call(point) for point in reversed(points)])

    assert study(RECIPE, engine(), backwards).to_dict() == study(RECIPE, engine()).to_dict()
    assert len(seen) == 2


@pytest.mark.parametrize(("s_squared", "severity"), [(0.76, None), (0.80, "caution"), (0.90, "bad")])
def test_a_doubtful_further_conformer_is_said(s_squared: float, severity: str | None) -> None:
    conformers = tuple(Conformer(METHYL, 0.001 * place, True, 100.0, None, 1) for place in range(2))
    settled = Settled(METHYL, "", True, 100.0, conformers, (0.7, 0.3))
    planned = plan(with_levels(Level("UHF", "pcH-1")), settled)
    first, second = planned.every_point
    found = assemble(planned, [engine()(first), engine(s_squared=s_squared)(second)]).rows("flags")
    assert [row["severity"] for row in found if row["code"] == "conformer-doubtful"] == (
        [severity] if severity else []
    )
