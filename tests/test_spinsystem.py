"""The spin-system file: schema, round trip, refusals that say where."""

from __future__ import annotations

import csv
import io
import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from jsonschema import Draft202012Validator
from spin_samples import record, system

from unpaired.errors import RecordError
from unpaired.spectrum.isotopologues import Question, spin_systems
from unpaired.spinsystem import read_systems, schema, systems_csv, systems_text

ONE = system(("13C", 1, 3.8), ("1H", 3, -2.3))
DESIGN_KEYS = {
    "schema_version",
    "radical",
    "level",
    "hamiltonian",
    "electron_spin",
    "g_iso",
    "g_source",
    "coupling_kind",
    "groups",
    "peak_to_peak_width_mT",
    "provenance",
}


def written(path: Path, content: Any) -> Path:
    path.write_text(content if isinstance(content, str) else json.dumps(content), encoding="utf-8")
    return path


def test_the_schema_is_a_schema() -> None:
    Draft202012Validator.check_schema(schema())


def test_the_file_has_the_keys_of_the_design() -> None:
    data = json.loads(systems_text([ONE]))
    assert set(data) == DESIGN_KEYS | {"isotopologue", "share"}
    assert set(data["groups"][0]) == {
        "group",
        "isotope",
        "nuclear_spin",
        "count",
        "a_iso_MHz",
        "a_iso_mT",
        "nuclei",
    }
    assert data["groups"][1]["nuclei"][2] == {"atom": "H4", "dipolar_MHz": None}
    assert data["hamiltonian"] == "h a S.I"
    assert data["groups"][1]["a_iso_mT"] == -2.3


def test_what_is_written_fits_the_whole_schema() -> None:
    for systems in ([ONE], [ONE, ONE]):
        Draft202012Validator(schema()).validate(json.loads(systems_text(systems)))


couplings = st.floats(-50, 50, allow_nan=False)


@settings(deadline=None, max_examples=30)
@given(
    st.lists(
        st.tuples(st.sampled_from(["1H", "14N", "13C", "19F"]), st.integers(1, 4), couplings), max_size=4
    ),
    st.floats(0.1, 10),
    st.none() | st.floats(1e-3, 10),
)
def test_reading_back_gives_the_same_object(
    tmp_path_factory: pytest.TempPathFactory,
    groups: list[tuple[str, int, float]],
    g: float,
    width: float | None,
) -> None:
    first = replace(system(*groups, g_iso=g), peak_to_peak_width_mT=width, share=0.25)
    path = tmp_path_factory.mktemp("spin") / "system.json"
    path.write_text(systems_text([first]), encoding="utf-8")
    assert read_systems(path) == (first,)


def test_several_systems_with_tensors_come_back_the_same(tmp_path: Path) -> None:
    result = record([("1H", 2, -2.0), ("35Cl", 1, 0.3)], tensor=[1.0, 2.0, -3.0, 4.0, 5.0, 6.0])
    systems = spin_systems(result, Question())
    assert read_systems(written(tmp_path / "many.json", systems_text(systems))) == systems
    assert len(systems) == 2


def test_csv_has_a_row_per_group() -> None:
    rows = list(csv.DictReader(io.StringIO(systems_csv([ONE, ONE]))))
    assert len(rows) == 4
    assert rows[1]["group"] == "H2"
    assert rows[1]["atoms"] == "H2 H3 H4"
    assert float(rows[1]["a_iso_mT"]) == -2.3


def changed(**changes: Any) -> dict[str, Any]:
    return json.loads(systems_text([ONE])) | changes


def group(**changes: Any) -> dict[str, Any]:
    data = changed()
    data["groups"][1] |= changes
    return data


WITHOUT_G = {key: value for key, value in changed().items() if key != "g_iso"}


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("{", r"bad.json:1: is not JSON"),
        ("[]", r"bad.json: holds neither a spin system nor a list"),
        ("3", r"bad.json: holds neither a spin system nor a list"),
        ('{"g_iso": NaN}', r"bad.json: is not a spin-system file \(NaN is not a number"),
        (WITHOUT_G, r"bad.json: top level: 'g_iso' is a required property"),
        (changed(schema_version=2), r"bad.json: schema_version: 1 was expected"),
        (changed(electron_spin=0.7), r"bad.json: electron_spin: 0.7 is not a multiple of 0.5"),
        (changed(coupling_kind="mean"), r"bad.json: coupling_kind: 'mean' is not one of"),
        (changed(colour="red"), r"bad.json: top level: Additional properties are not allowed .'colour'"),
        (changed(peak_to_peak_width_mT=0), r"bad.json: peak_to_peak_width_mT: 0 is less than or equal"),
        (group(isotope="H1"), r"bad.json: groups\[1\].isotope: 'H1' does not match"),
        (group(isotope="99H"), r'bad.json: groups\[1\].isotope: isotope "99H" is not in the table'),
        (group(nuclear_spin=1.5), r"bad.json: groups\[1\].nuclear_spin: is 1.5, but 1H has 0.5"),
        (group(count=2), r"bad.json: groups\[1\].count: is 2, but nuclei holds 3"),
        (group(a_iso_mT=-2.4), r"bad.json: groups\[1\].a_iso_mT: is -2.4, but a_iso_MHz is -64.4"),
        (group(a_iso_MHz="large"), r"bad.json: groups\[1\].a_iso_MHz: 'large' is not of type 'number'"),
        (
            group(nuclei=[{"atom": "C1", "dipolar_MHz": None}], count=1),
            r"bad.json: groups\[1\].nuclei\[0\].atom: C1 occurs twice",
        ),
        (
            group(nuclei=[{"atom": "H2", "dipolar_MHz": [[1, 2], [3, 4]]}], count=1),
            r"bad.json: groups\[1\].nuclei\[0\].dipolar_MHz",
        ),
        ([changed(), changed(g_iso=-2)], r"bad.json: \[1\].g_iso: -2 is less than or equal"),
    ],
)
def test_a_file_that_is_wrong_says_where(tmp_path: Path, content: Any, words: str) -> None:
    with pytest.raises(RecordError, match=words):
        read_systems(written(tmp_path / "bad.json", content))


def test_a_missing_file_is_named() -> None:
    with pytest.raises(RecordError, match=r"nowhere.json: cannot be read"):
        read_systems("nowhere.json")


def test_nothing_wrong_is_written() -> None:
    with pytest.raises(RecordError, match=r"to be written: groups\[0\].count"):
        systems_text([replace(ONE, groups=(replace(ONE.groups[0], count=5),))])


def test_files_of_every_released_version_are_read_for_ever() -> None:
    pinned = Path(__file__).parent / "pinned" / "spin-system-1.json"
    (found,) = read_systems(pinned)
    assert (found.radical, found.isotopologue, found.peak_to_peak_width_mT) == ("h2no", "15N(N1)", 0.1)
    assert [group.a_iso_MHz for group in found.groups] == [-22.46885280127841, -41.52556321593258]
    assert systems_text([found]) == pinned.read_text(encoding="utf-8")
