"""From a drawing to a proven minimum, on radicals small enough for every day; larger ones are slow."""

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from unpaired.constants import BOHR_ANGSTROM
from unpaired.electronic.hessian import (
    analytic_hessian,
    difference_hessian,
    forward_hessian,
    hessian_product,
)
from unpaired.electronic.relax import LOOSE, ROUGH_STEPS, relax
from unpaired.electronic.surface import Surface
from unpaired.errors import ConvergenceError, EngineError
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.proof import curvature_of
from unpaired.recipe.load import load_recipe
from unpaired.recipe.recipe import Recipe
from unpaired.settle import prove, settle, unsettled
from unpaired.settled import Conformer, weigh
from unpaired.structures.modes import masses_u, normal_modes
from unpaired.structures.xyz import read_xyz, xyz_text
from unpaired.study import study

CHEAP = Level("UKS", "pcseg-0", "B3LYP")
RELAX = "relax: {functional: B3LYP, basis: pcseg-0}\n"


def recipe(folder: Path, smiles: str, more: str = RELAX) -> Recipe:
    path = folder / "a.yaml"
    path.write_text(f'radical: a\nstructure: {{smiles: "{smiles}"}}\n{more}')
    return load_recipe(path)


def linear_nh2() -> Molecule:
    """NH2 stretched straight: the saddle between its two bent minima."""
    return Molecule(("N", "H", "H"), np.array([[0, 0, 0], [0, 0, 1.85], [0, 0, -1.85]]), 0, 2)


def test_a_drawing_is_relaxed_proven_and_says_how(tmp_path: Path) -> None:
    """NH2 is bent, with an angle near 103 degrees (common practice; 102 to 106 at this level)."""
    steps = []
    settled = settle(recipe(tmp_path, "[NH2]"), lambda *step: steps.append(step))
    assert settled.minimum is True
    assert settled.lowest_mode_cm is not None
    assert settled.lowest_mode_cm > 1000
    n, first, second = settled.molecule.coordinates_bohr
    cosine = (first - n) @ (second - n) / np.linalg.norm(first - n) / np.linalg.norm(second - n)
    assert 100 < np.degrees(np.arccos(cosine)) < 108
    assert "relaxed at UKS-B3LYP/pcseg-0" in settled.note
    assert "from SMILES [NH2]" in settled.note
    assert "minimum" in settled.note
    assert {step[0] for step in steps} >= {"rough 1/2", "relax 1/1"}


@pytest.mark.slow
def test_a_saddle_in_a_file_is_found_and_left_downhill(tmp_path: Path) -> None:
    (tmp_path / "linear.xyz").write_text(xyz_text(linear_nh2(), "linear"))
    path = tmp_path / "a.yaml"
    path.write_text(f"radical: a\nstructure: linear.xyz\n{RELAX}")
    settled = settle(load_recipe(path))
    assert settled.minimum is True
    assert any("a saddle, followed downhill" in sentence for sentence in settled.story)


@pytest.mark.slow
def test_a_saddle_is_proven_to_be_one_and_flagged(tmp_path: Path) -> None:
    surface = Surface(linear_nh2(), CHEAP)
    end = relax(("N", "H", "H"), linear_nh2().coordinates_bohr, surface)
    (tmp_path / "linear.xyz").write_text(xyz_text(linear_nh2().moved(end.coordinates_bohr), "linear"))
    path = tmp_path / "a.yaml"
    path.write_text(f"radical: a\nstructure: linear.xyz\n{RELAX}")
    proven = prove(load_recipe(path))
    assert proven.minimum is False
    assert [flag.code for flag in proven.flags] == ["saddle"]
    np.testing.assert_allclose(proven.molecule.coordinates_bohr, end.coordinates_bohr, atol=1e-9)


def test_an_atom_needs_no_relaxation(tmp_path: Path) -> None:
    settled = settle(recipe(tmp_path, "[H]"))
    assert settled.minimum is True
    assert settled.lowest_mode_cm is None


def test_without_relaxation_nothing_is_computed(tmp_path: Path) -> None:
    settled = unsettled(recipe(tmp_path, "[CH3]"))
    assert settled.minimum is None
    assert settled.molecule.elements == ("C", "H", "H", "H")
    assert "not relaxed" in settled.note


@pytest.mark.slow
def test_analytic_hessian_agrees_with_gradient_differences() -> None:
    molecule = Molecule(("N", "H", "H"), np.array([[0, 0, 0], [1.9, 0, 0], [-0.4, 1.85, 0]]), 0, 2)
    surface = Surface(molecule, CHEAP)
    analytic = analytic_hessian(surface, molecule.coordinates_bohr)
    assert analytic is not None
    np.testing.assert_allclose(analytic, difference_hessian(surface, molecule.coordinates_bohr), atol=2e-3)
    direction = np.eye(9)[3]
    np.testing.assert_allclose(
        hessian_product(surface, molecule.coordinates_bohr)(direction), analytic[3], atol=2e-3
    )


def test_restricted_open_levels_have_no_analytic_hessian() -> None:
    molecule = Molecule(("N", "H", "H"), np.array([[0, 0, 0], [1.9, 0, 0], [-0.4, 1.85, 0]]), 0, 2)
    assert analytic_hessian(Surface(molecule, Level("ROHF", "pcseg-0")), molecule.coordinates_bohr) is None


def test_finished_steps_are_replayed_from_disk(tmp_path: Path) -> None:
    molecule = Molecule(("N", "H", "H"), np.array([[0, 0, 0], [1.9, 0, 0], [-0.4, 1.85, 0]]), 0, 2)
    first = Surface(molecule, CHEAP, folder=tmp_path)
    end = relax(molecule.elements, molecule.coordinates_bohr, first)
    second = Surface(molecule, CHEAP, folder=tmp_path)
    again = relax(molecule.elements, molecule.coordinates_bohr, second)
    assert first.computed == end.steps
    assert second.computed == 0
    np.testing.assert_array_equal(again.coordinates_bohr, end.coordinates_bohr)


def _conformer(energy: float, order: int, zero_point: float | None = None) -> Conformer:
    return Conformer(linear_nh2(), energy, True, 100.0, zero_point, order)


def test_weights_are_boltzmann_factors_times_the_number_of_copies() -> None:
    """Two gauche copies 1 kJ/mol above one trans form: exact arithmetic with R = 8.314462618 J/(mol K)."""
    above = 1.0 / 2625.4996394799
    weights, with_zero_point = weigh([_conformer(0.0, 2), _conformer(above, 1)], 298.15)
    factor = 2 * np.exp(-1000 / (8.314462618 * 298.15))
    np.testing.assert_allclose(weights, [1 / (1 + factor), factor / (1 + factor)], rtol=1e-6)
    assert with_zero_point is False


def test_zero_point_energy_counts_only_if_every_conformer_has_it() -> None:
    both, with_zero_point = weigh([_conformer(0.0, 1, 0.01), _conformer(0.0, 1, 0.01)], 300)
    assert both == (0.5, 0.5)
    assert with_zero_point
    assert weigh([_conformer(0.0, 1, 0.01), _conformer(0.0, 1, None)], 300) == ((0.5, 0.5), False)


def test_at_zero_kelvin_only_the_lowest_counts() -> None:
    assert weigh([_conformer(0.0, 2), _conformer(1e-4, 1)], 0.0)[0] == (1.0, 0.0)


@pytest.mark.slow
def test_a_killed_settling_goes_on_where_it_was(tmp_path: Path) -> None:
    recipe(tmp_path, "[NH2]")
    command = [sys.executable, "-m", "unpaired", "structure", "a.yaml", "--output", "a.xyz"]
    environment = {**os.environ, "PYTHONPATH": str(Path(__file__).parent.parent / "src")}
    process = subprocess.Popen(command, cwd=tmp_path, env=environment, stderr=subprocess.DEVNULL)
    store = tmp_path / "results" / ".store"
    deadline = time.monotonic() + 120
    while len(list(store.glob("surface-*/gradient-*.json"))) < 4:
        assert process.poll() is None
        assert time.monotonic() < deadline
        time.sleep(0.05)
    process.send_signal(signal.SIGKILL)
    process.wait()
    done = {path: path.stat().st_mtime_ns for path in store.glob("surface-*/gradient-*.json")}
    subprocess.run(command, cwd=tmp_path, env=environment, check=True, capture_output=True)
    assert all(path.stat().st_mtime_ns == stamp for path, stamp in done.items())
    assert "minimum" in read_xyz(tmp_path / "a.xyz").comment


@pytest.mark.slow
@pytest.mark.parametrize("smiles", ["[CH]=O", "C=[CH]"])
def test_radicals_that_are_embedded_straight_end_bent(tmp_path: Path, smiles: str) -> None:
    """Physics notes, section 10: HCO and vinyl are bent, their straight structures saddles."""
    settled = settle(recipe(tmp_path, smiles))
    assert settled.minimum is True
    molecule = settled.molecule
    modes = normal_modes(
        analytic_hessian(Surface(molecule, CHEAP), molecule.coordinates_bohr),
        molecule.coordinates_bohr,
        masses_u(molecule.elements),
    )
    assert modes.wavenumbers_cm[0] > 300


def test_an_unstable_electronic_state_is_left_before_the_relaxation_begins() -> None:
    """N2+ at 1.116 A in UHF: the guess leads to a state above the lowest one (physics notes, section 10)."""
    positions = np.array([[0, 0, 0], [0, 0, 1.116 / BOHR_ANGSTROM]])
    surface = Surface(Molecule(("N", "N"), positions, 1, 2), Level("UHF", "pcseg-0"))
    before = surface.converged(positions).e_tot
    assert "a lower one was found" in surface.steady(positions)
    assert surface.converged(positions).e_tot < before - 0.005
    assert surface.steady(positions) == ""


def test_a_rough_relaxation_ends_where_a_strict_one_complains() -> None:
    """A surface whose gradient never vanishes: two nuclei on a slope of constant steepness."""

    def slope(coordinates: np.ndarray) -> tuple[float, np.ndarray]:
        apart = coordinates[1, 2] - coordinates[0, 2]
        gradient = np.zeros((2, 3))
        gradient[0, 2], gradient[1, 2] = 0.01, -0.01
        return -0.01 * apart, gradient

    start = np.array([[0, 0, 0], [0, 0, 2.0]])
    end = relax(("N", "N"), start, slope, LOOSE, rough=True)
    assert end.energy_Eh < slope(start)[0]
    assert end.steps <= ROUGH_STEPS + 1
    with pytest.raises(ConvergenceError, match="the structure is not relaxed after"):
        relax(("N", "N"), start, slope)


def test_a_recipe_with_a_drawing_goes_through_the_main_job(tmp_path: Path) -> None:
    """The helium cation has one electron: no vibration, one proven structure, 3He at -309.21 mT measured."""
    levels = "levels: [{scf: UHF, basis: pcH-2}]\n"
    result = study(recipe(tmp_path, "[He+]", levels))
    (row,) = result.rows("states")
    assert row["minimum"] is True
    assert row["lowest_mode_cm"] is None
    assert result.rows("couplings")[0]["a_iso_mT"] == pytest.approx(-309.21, rel=0.01)
    assert "from SMILES [He+]" in result.structure_note
    assert result.provenance["structure"]["story"]


def test_a_structure_is_kept_when_its_curvature_cannot_be_computed(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(*arguments: object) -> None:
        raise EngineError("no second derivatives today")

    monkeypatch.setattr("unpaired.settle.curvature_of", fail)
    (tmp_path / "h2.xyz").write_text("2\n\nH 0 0 0\nH 0 0 1.1\n")
    path = tmp_path / "a.yaml"
    path.write_text(f"radical: a\nstructure: h2.xyz\ncharge: 1\n{RELAX}")
    settled = settle(load_recipe(path))
    assert settled.minimum is None
    assert [flag.code for flag in settled.flags] == ["curvature-unknown"]
    assert "curvature not checked: no second derivatives today" in settled.story


def test_one_electron_has_a_curvature_too() -> None:
    """H2+ has one bond and one vibration; PySCF's analytic second derivatives fail on its empty spin."""
    molecule = Molecule(("H", "H"), np.array([[0, 0, 0], [0, 0, 2.05]]), 1, 2)
    surface = Surface(molecule, CHEAP)
    assert analytic_hessian(surface, molecule.coordinates_bohr) is None
    found = curvature_of(surface, molecule.coordinates_bohr)
    assert found.minimum is True
    assert "gradient differences" in found.story


def test_a_hessian_with_a_negative_curvature_leads_downhill_all_the_same() -> None:
    """A surface of three springs, its Hessian with the softest curvature turned negative: the first step goes down."""
    minimum = np.array([[0, 0, 0], [1.9, 0, 0], [-0.4, 1.85, 0]])
    energies = []

    def surface(coordinates: np.ndarray) -> tuple[float, np.ndarray]:
        lengths, slopes = _springs(coordinates)
        stretched = lengths - _springs(minimum)[0]
        energies.append(float(stretched @ stretched) / 2)
        return energies[-1], np.tensordot(stretched, slopes, 1)

    start = minimum + 0.05 * np.array([[0.0, 0, 0], [1, 1, 0], [1, 0, 0]])
    curvatures, directions = np.linalg.eigh(forward_hessian(surface, start))
    soft = int(np.flatnonzero(curvatures > 0.05)[0])  # beyond translations and rotations
    curvatures[soft] *= -1
    energies.clear()
    wrong = (directions * curvatures) @ directions.T
    end = relax(("N", "H", "H"), start, surface, hessian=wrong)
    np.testing.assert_allclose(_springs(end.coordinates_bohr)[0], _springs(minimum)[0], atol=2e-3)
    assert energies[1] < 0.1 * energies[0]


def _springs(coordinates: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The three distances, and their derivatives, shape (3, atoms, 3)."""
    lengths, slopes = [], np.zeros((3, 3, 3))
    for row, (i, j) in enumerate(((0, 1), (0, 2), (1, 2))):
        bond = coordinates[i] - coordinates[j]
        lengths.append(np.linalg.norm(bond))
        slopes[row, i], slopes[row, j] = bond / lengths[-1], -bond / lengths[-1]
    return np.array(lengths), slopes
