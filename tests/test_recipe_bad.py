"""A corpus of bad recipes: each says in its first line what it must be told."""

from __future__ import annotations

from pathlib import Path

import pytest

from unpaired.errors import RecipeError
from unpaired.recipe import load_recipe

FOLDER = Path(__file__).parent / "recipes_bad"
BAD = sorted(FOLDER.glob("*.yaml"))


def _expected(path: Path) -> str:
    data = path.read_bytes()
    text = data.decode("utf-16" if data.startswith(b"\xff\xfe") else "latin-1")
    head, _, match = text.split("\n", 1)[0].partition("# MATCH: ")
    assert head.strip("\ufeff") == ""
    assert len(match) > 5, f"{path.name} does not say what it must be told"
    return match


@pytest.mark.parametrize("path", BAD, ids=lambda path: path.stem)
def test_bad_recipe_is_told_what_is_wrong(path: Path) -> None:
    with pytest.raises(RecipeError) as caught:
        load_recipe(path)
    assert all(problem.startswith(f"{path}:") for problem in caught.value.problems)
    sentences = [problem.removeprefix(str(path)) for problem in caught.value.problems]
    assert any(_expected(path) in sentence for sentence in sentences), sentences


@pytest.mark.parametrize("path", BAD, ids=lambda path: path.stem)
def test_each_problem_is_one_line(path: Path) -> None:
    with pytest.raises(RecipeError) as caught:
        load_recipe(path)
    assert caught.value.message == "\n".join(caught.value.problems)
    assert len(caught.value.message.split("\n")) == len(caught.value.problems)


def test_corpus_is_large_enough() -> None:
    assert len(BAD) >= 35
