"""The demo: candidates of an invented case."""

from __future__ import annotations

from pathlib import Path

from unpaired.recipe import load_recipes

DEMO = sorted((Path(__file__).parent.parent / "recipes" / "demo").glob("*.yaml"))


def test_at_least_four_candidates_load_together() -> None:
    assert len(load_recipes(DEMO)) >= 4


def test_invented_splittings_say_so() -> None:
    for path, recipe in zip(DEMO, load_recipes(DEMO), strict=True):
        assert recipe.measured
        assert all("invented" in value.source for value in recipe.measured)
        assert "THE SPLITTINGS BELOW ARE INVENTED" in path.read_text(encoding="utf-8")


def test_structures_say_how_they_were_made() -> None:
    for recipe in load_recipes(DEMO):
        assert "relaxed with UKS-B3LYP/pcseg-1" in recipe.structure_comment
        assert "lowest mode" in recipe.structure_comment
