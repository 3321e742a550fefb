"""The README says what the program does: its generated parts are compared with their makers."""

from __future__ import annotations

import re
from pathlib import Path

from unpaired import columns
from unpaired.errors import CalculationError
from unpaired.recipe.load import load_recipe

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def block(name: str) -> str:
    """Text between `<!-- begin: name -->` and `<!-- end: name -->`."""
    return README.split(f"<!-- begin: {name} -->\n")[1].split(f"<!-- end: {name} -->")[0]


def test_the_table_of_columns_is_the_registry() -> None:
    assert block("columns") == columns.markdown()


def test_the_recipe_that_is_explained_is_accepted(tmp_path: Path) -> None:
    (tmp_path / "recipes").mkdir()
    (tmp_path / "molecules").symlink_to(ROOT / "molecules")
    recipe = tmp_path / "recipes" / "readme.yaml"
    recipe.write_text(README.split("```yaml\n")[1].split("```")[0], encoding="utf-8")
    assert load_recipe(recipe).radical == "hydroxymethyl"


def test_every_finding_and_every_failure_is_explained() -> None:
    source = "\n".join(path.read_text(encoding="utf-8") for path in (ROOT / "src").rglob("*.py"))
    codes = set(re.findall(r'Flag\(\s*"([a-z-]+)"', source)) | set(
        re.findall(r'Failure\("([a-z-]+)"', source)
    )
    codes |= {error.tag for error in (CalculationError, *CalculationError.__subclasses__())}
    assert {code for code in codes if f"`{code}`" not in README} == set()


def test_the_top_level_holds_only_what_it_should() -> None:
    allowed = {"README.md", "DEVELOPERS.md", "pyproject.toml", "src", "recipes", "tests", "molecules"}
    found = {path.name for path in ROOT.iterdir() if not path.name.startswith(".")}
    assert found - {"results", "build"} == allowed
