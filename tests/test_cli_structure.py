"""unpaired structure as a user meets it: where the XYZ goes, what is refused."""

from pathlib import Path

import pytest
from typer.testing import CliRunner

from unpaired.cli import app
from unpaired.structures.xyz import parse_xyz, read_xyz


@pytest.fixture(autouse=True)
def in_a_folder_of_its_own(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    for name in ("hydrogen", "tritium"):
        isotopes = "isotopes: {H1: 3H}\n" if name == "tritium" else ""
        Path(f"{name}.yaml").write_text(f'radical: {name}\nstructure: {{smiles: "[H]"}}\n{isotopes}')


def run(*arguments: str) -> tuple[int, str, str]:
    outcome = CliRunner().invoke(app, ["structure", *arguments])
    return outcome.exit_code, outcome.stdout, outcome.stderr


def test_without_output_the_structure_is_printed_and_its_story_kept_apart() -> None:
    status, out, err = run("hydrogen.yaml")
    assert status == 0
    assert parse_xyz(out, "out").elements == ("H",)
    assert "hydrogen: " in err


def test_the_file_can_be_given_back_as_a_structure() -> None:
    assert run("hydrogen.yaml", "--output", "h.xyz")[0] == 0
    comment = read_xyz("h.xyz").comment
    assert comment.startswith("hydrogen, relaxed at UKS-B3LYP/pcseg-1")
    Path("again.yaml").write_text("radical: again\nstructure: h.xyz\n")
    assert run("again.yaml")[0] == 0


def test_several_recipes_go_into_a_folder() -> None:
    assert run("hydrogen.yaml", "tritium.yaml", "--output", "made")[0] == 0
    assert sorted(path.name for path in Path("made").iterdir()) == ["hydrogen.xyz", "tritium.xyz"]


def test_another_suffix_is_refused() -> None:
    status, _, err = run("hydrogen.yaml", "--output", "h.pdb")
    assert status == 2
    assert err == "h.pdb: a structure is written as .xyz; give a name that ends so, or a folder\n"


def test_a_bad_drawing_is_refused_before_anything_runs() -> None:
    Path("bad.yaml").write_text('radical: bad\nstructure: {smiles: "[CH3].[CH3]"}\n')
    status, out, err = run("hydrogen.yaml", "bad.yaml")
    assert (status, out) == (2, "")
    assert "the dot makes it two molecules; give one radical" in err
