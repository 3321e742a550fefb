"""The README says what the program does: its generated parts are compared with their makers."""

from __future__ import annotations

from pathlib import Path

from unpaired import columns

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def block(name: str) -> str:
    """Text between `<!-- begin: name -->` and `<!-- end: name -->`."""
    return README.split(f"<!-- begin: {name} -->\n")[1].split(f"<!-- end: {name} -->")[0]


def test_the_table_of_columns_is_the_registry() -> None:
    assert block("columns") == columns.markdown()


def test_the_top_level_holds_only_what_it_should() -> None:
    allowed = {"README.md", "DEVELOPERS.md", "pyproject.toml", "src", "recipes", "tests", "molecules"}
    found = {path.name for path in ROOT.iterdir() if not path.name.startswith(".")}
    assert found - {"results", "build"} == allowed
