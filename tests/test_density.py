"""Spin density in planes and boxes: geometry, integral, open format, refusals."""

from __future__ import annotations

import xml.etree.ElementTree as ElementTree

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from typer.testing import CliRunner

from unpaired import machine
from unpaired.cli import app
from unpaired.density import choose_box, choose_plane, density_in_box, density_in_plane, stored_state
from unpaired.electronic.settings import identity
from unpaired.electronic.solve import solve
from unpaired.errors import InputError, RecordError
from unpaired.figures.density import contour_levels, density_figure
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point
from unpaired.properties.contact import spin_density_at_nuclei
from unpaired.properties.grids import molecular_plane, plane_through
from unpaired.result import Result
from unpaired.store import Store
from unpaired.tables import write_result

AMIDOGEN = Molecule(("N", "H", "H"), [[0, 0, 0], [1.52, 1.20, 0], [-1.52, 1.20, 0]], 0, 2)
LEVEL = Level("UHF", "pcH-1")


@pytest.fixture(scope="module")
def amidogen():
    point = Point(AMIDOGEN, LEVEL)
    return point, solve(point)


@pytest.fixture
def folder(tmp_path, amidogen):
    """A run's folder with its store beside it."""
    point, state = amidogen
    Store(tmp_path, identity).save(point, state)
    names = {"radical": "amidogen", "level": LEVEL.id}
    recipe = {"radical": "amidogen", "levels": [LEVEL.to_dict()], "solvent": None, "measured": []}
    tables = {"couplings": [], "states": [names | {"converged": True}], "flags": []}
    return write_result(Result("amidogen", recipe, AMIDOGEN, tables), tmp_path)


def command(*arguments):
    return CliRunner().invoke(app, ["density", *map(str, arguments)])


def test_the_box_sums_to_twice_the_spin(amidogen):
    """The integral of the spin density is 2S, exactly; a sum over points within 1 %."""
    box = choose_box(AMIDOGEN, 0.25)
    values = density_in_box(*amidogen, box)
    assert len(values) == box.size
    assert values.sum() * box.spacing_bohr**3 == pytest.approx(1, abs=0.01)


def test_the_plane_meets_the_contact_density_at_the_nuclei(amidogen):
    """A point of the plane that is a nucleus has the spin density that gives its coupling."""
    point, state = amidogen
    contact = spin_density_at_nuclei(state.solution.spin_density_matrix, state.ao_at_nuclei)
    plane = choose_plane(AMIDOGEN, None)
    found = density_in_plane(point, state, plane)
    seen, heights = plane.seen(AMIDOGEN.coordinates_bohr)
    assert heights == pytest.approx(np.zeros(3), abs=1e-12)
    for (x, y), exact in zip(seen, contact, strict=True):
        column = int(np.abs(found.across_bohr - x).argmin())
        row = int(np.abs(found.upwards_bohr - y).argmin())
        assert found.values_au[row, column] == pytest.approx(
            exact, abs=0.35 * abs(exact)
        )  # up to 0.04 bohr away


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 10**6))
def test_a_plane_holds_its_three_atoms_and_all_nuclei_lie_within_its_frame(seed):
    coordinates = np.random.default_rng(seed).normal(size=(6, 3)) * 3
    plane = plane_through(coordinates[:3], coordinates, 1.0)
    seen, heights = plane.seen(coordinates)
    assert heights[:3] == pytest.approx(np.zeros(3), abs=1e-9)
    assert np.all(np.abs(seen) <= np.array([plane.half_width_bohr, plane.half_height_bohr]) - 1 + 1e-9)
    points = plane.points_bohr(0.5)
    assert (points - plane.origin_bohr) @ plane.normal == pytest.approx(np.zeros(len(points)), abs=1e-9)


@pytest.mark.parametrize("atoms", [1, 2, 3])
def test_atoms_and_linear_molecules_lie_in_a_plane(atoms):
    coordinates = np.outer(np.arange(atoms), [0.0, 0.0, 2.0])
    plane, distance = molecular_plane(coordinates, 1.0)
    assert distance == pytest.approx(0, abs=1e-12)
    assert np.linalg.norm(plane.normal) == pytest.approx(1)


def test_contour_levels_are_symmetric_about_zero(amidogen):
    plane = choose_plane(AMIDOGEN, None)
    levels = contour_levels(density_in_plane(*amidogen, plane), AMIDOGEN)
    assert levels == pytest.approx(-levels[::-1])
    assert np.all(np.diff(levels) > 0)


def test_the_picture_labels_every_nucleus(amidogen):
    plane = choose_plane(AMIDOGEN, None)
    found = density_in_plane(*amidogen, plane)
    assert density_figure(found, AMIDOGEN, "amidogen", "png").startswith(b"\x89PNG")
    assert density_figure(found, AMIDOGEN, "amidogen", "svg").startswith(b"<?xml")


def test_the_box_file_is_well_formed_image_data(folder, tmp_path):
    """Read back with Python's own XML reader: extent, number of values, and the integral."""
    target = tmp_path / "box.vti"
    done = command(folder, "--output", target, "--spacing-bohr", "0.4")
    assert done.exit_code == 0, done.output
    image = ElementTree.parse(target).getroot().find("ImageData")
    bounds = [int(text) for text in image.get("WholeExtent").split()]
    counts = [bounds[1] + 1, bounds[3] + 1, bounds[5] + 1]
    values = np.array(image.find("Piece/PointData/DataArray").text.split(), dtype=float)
    assert len(values) == np.prod(counts)
    assert image.get("Spacing") == "0.4 0.4 0.4"
    assert f"{values.sum() * 0.4**3:.3f}" in done.output


def test_the_command_draws_the_stored_state(folder, tmp_path):
    target = tmp_path / "plane.svg"
    done = command(folder, "--output", target)
    assert done.exit_code == 0, done.output
    assert target.stat().st_size > 10_000


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["--plane", "N1,H2"], "give three atoms"),
        (["--plane", "N1,H2,H9"], "there is no atom H9"),
        (["--plane", "N1,H2,H2"], "three different atoms"),
    ],
)
def test_a_bad_plane_is_refused_in_one_sentence(folder, tmp_path, arguments, words):
    done = command(folder, "--output", tmp_path / "plane.svg", *arguments)
    assert done.exit_code == 2
    assert words in done.stderr
    assert done.stderr.count("\n") == 1


def test_three_atoms_on_a_line_make_no_plane():
    line = Molecule(("C", "N", "O"), [[0, 0, 0], [0, 0, 2], [0, 0, 4]], 0, 2)
    with pytest.raises(InputError, match="lie on a line"):
        choose_plane(line, ("C1", "N2", "O3"))


def test_a_molecule_without_a_plane_asks_for_three_atoms():
    bent = Molecule(("C", "H", "H", "H", "H"), np.random.default_rng(0).normal(size=(5, 3)) * 3, 0, 2)
    with pytest.raises(InputError, match="name three atoms with --plane"):
        choose_plane(bent, None)


def test_a_box_too_large_for_the_memory_is_refused_and_says_what_fits(monkeypatch):
    monkeypatch.setattr(machine, "memory_bytes", lambda: 10_000_000)
    with pytest.raises(InputError, match="take 0") as caught:
        choose_box(AMIDOGEN, 0.05)
    fits = float(caught.value.message.split("take ")[1].split()[0])
    assert choose_box(AMIDOGEN, fits).size > 0


@pytest.mark.parametrize("spacing", [0.0, -0.2, float("nan")])
def test_a_spacing_must_be_positive(spacing):
    with pytest.raises(InputError, match="must be above 0"):
        choose_box(AMIDOGEN, spacing)


def test_a_state_that_is_not_stored_is_said(folder):
    from unpaired.result import load_result

    record = load_result(folder)
    for entry in (folder.parent / ".store").iterdir():
        entry.rename(entry.with_name("gone"))
    with pytest.raises(RecordError, match="not in the store beside it"):
        stored_state(record, folder, LEVEL.id)


@pytest.mark.parametrize(("output", "more"), [("picture.gif", []), ("box.vti", ["--plane", "N1,H2,H3"])])
def test_an_ending_that_does_not_fit_is_refused(folder, tmp_path, output, more):
    assert command(folder, "--output", tmp_path / output, *more).exit_code == 2
