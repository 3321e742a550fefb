"""Laws of recipes: any text is understood or refused in sentences; the order of keys means nothing."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
import yaml
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from unpaired.errors import RecipeError
from unpaired.recipe import load_recipe
from unpaired.recipe.levels import LEVEL_KEYS
from unpaired.recipe.load import KEYS, MOTION_KEYS

METHYL = Path(__file__).parent / "recipes_good" / "structures" / "methyl.xyz"
QUICK = settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])

SCALARS = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(),
    st.floats(),
    st.text(max_size=12),
    st.sampled_from(["UHF", "pcH-1", "H2", "C1", "13C", "2H", "water", "unknown", "+", str(METHYL)]),
)
WORDS = st.one_of(
    st.sampled_from([*KEYS, *LEVEL_KEYS, *MOTION_KEYS, "value", "source", "atoms", "count", "coupling_mT"]),
    st.text(max_size=8),
)
VALUES = st.recursive(
    SCALARS,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(WORDS, inner, max_size=4),
    max_leaves=12,
)


def _refused_or_understood(path: Path) -> None:
    problems: tuple[str, ...] | None = None
    try:
        load_recipe(path)
    except RecipeError as error:
        problems = error.problems
    assert problems != ()
    for problem in problems or ():
        assert problem.startswith(f"{path}:")
        problem.encode()  # can be printed


@QUICK
@given(st.dictionaries(st.sampled_from(KEYS) | WORDS, VALUES, max_size=8))
def test_random_recipes_are_refused_in_sentences(tmp_path: Path, data: dict[str, Any]) -> None:
    path = tmp_path / "recipe.yaml"
    path.write_text(yaml.safe_dump({"radical": "methyl", "structure": str(METHYL)} | data))
    _refused_or_understood(path)


@QUICK
@given(
    st.text(alphabet=st.sampled_from("abN:-[]{},#&*!|>'\"%@`?\\ \n\t01.~\x00\ufeff\x85\u2028"), max_size=60)
)
def test_random_text_is_refused_in_sentences(tmp_path: Path, text: str) -> None:
    path = tmp_path / "recipe.yaml"
    path.write_text(text, encoding="utf-8", newline="")
    _refused_or_understood(path)


@QUICK
@given(st.binary(max_size=60))
def test_random_bytes_are_refused_in_sentences(tmp_path: Path, data: bytes) -> None:
    path = tmp_path / "recipe.yaml"
    path.write_bytes(data)
    _refused_or_understood(path)


MEANINGFUL: dict[str, Any] = {
    "radical": "methyl",
    "structure": str(METHYL),
    "charge": 0,
    "multiplicity": 4,
    "levels": [{"scf": "UHF", "basis": "pcH-1"}, {"scf": "UKS", "functional": "PBE0", "basis": "pcH-1"}],
    "solvent": "water",
    "isotopes": {"C1": "13C", "H2": "2H"},
    "groups": [["H3", "H4"]],
    "motion": {"rotors": True, "vibration": False},
    "temperature_K": 77,
    "g": {"value": 2.0026, "source": "invented"},
    "measured": [{"atoms": ["H3", "H4"], "count": 2, "coupling_mT": 2.3, "source": "invented"}],
}


@QUICK
@given(st.permutations(list(MEANINGFUL)))
def test_the_order_of_keys_means_nothing(tmp_path: Path, keys: list[str]) -> None:
    path = tmp_path / "recipe.yaml"
    path.write_text(yaml.safe_dump(MEANINGFUL))
    expected = load_recipe(path).to_dict()
    path.write_text(yaml.safe_dump({key: MEANINGFUL[key] for key in keys}, sort_keys=False))
    assert load_recipe(path).to_dict() == expected


def _as_recipe(understood: dict[str, Any]) -> dict[str, Any]:
    """The recipe that asks for what was understood."""
    data = {key: value for key, value in understood.items() if value is not None and value != []}
    del data["recipe_file"], data["temperature_assumed"]
    data["levels"] = [
        {key: value for key, value in level.items() if key != "id" and value is not None}
        for level in understood["levels"]
    ]
    if understood["solvent"]:
        named = understood["solvent"]["name"][0].isalpha()
        data["solvent"] = understood["solvent"]["name" if named else "dielectric"]
    data["measured"] = [
        {key: value for key, value in item.items() if value is not None} for item in understood["measured"]
    ]
    return {key: value for key, value in data.items() if value != []}


@QUICK
@given(
    st.sets(st.sampled_from([key for key in MEANINGFUL if key not in ("radical", "structure")])),
    st.sampled_from(["water", 7.2, 80]),
)
def test_asking_for_what_was_understood_is_understood_the_same(
    tmp_path: Path, keys: set[str], solvent: str | float
) -> None:
    path = tmp_path / "recipe.yaml"
    data = {key: value for key, value in MEANINGFUL.items() if key in keys | {"radical", "structure"}}
    if "solvent" in data:
        data["solvent"] = solvent
    path.write_text(yaml.safe_dump(data))
    first = load_recipe(path).to_dict()
    path.write_text(yaml.safe_dump(_as_recipe(first)))
    assert load_recipe(path).to_dict() | {"temperature_assumed": first["temperature_assumed"]} == first


@pytest.mark.parametrize("levels", [["[" * 500], ["{a: " * 500], ["- " * 500], ["? " * 500]])
def test_nesting_without_end_is_refused(tmp_path: Path, levels: list[str]) -> None:
    path = tmp_path / "recipe.yaml"
    path.write_text(f"radical: methyl\ngroups: {levels[0]}\n")
    _refused_or_understood(path)
    with pytest.raises(RecipeError):
        load_recipe(path)
