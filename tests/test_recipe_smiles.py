"""A recipe that starts from SMILES."""

from __future__ import annotations

from pathlib import Path

import pytest

from unpaired.errors import RecipeError
from unpaired.level import Level
from unpaired.recipe import load_recipe


def _write(folder: Path, smiles: str, *lines: str) -> Path:
    path = folder / "recipe.yaml"
    path.write_text("\n".join(["radical: x", f'structure: {{smiles: "{smiles}"}}', *lines]) + "\n")
    return path


def _problem(path: Path) -> str:
    with pytest.raises(RecipeError) as caught:
        load_recipe(path)
    (problem,) = caught.value.problems
    return problem.removeprefix(f"{path}:")


def test_atoms_are_known_but_not_their_places(tmp_path: Path) -> None:
    recipe = load_recipe(_write(tmp_path, "[CH2]O", "groups: [[H3, H4]]"))
    assert (recipe.smiles, recipe.structure, recipe.molecule) == ("[CH2]O", None, None)
    assert (recipe.charge, recipe.multiplicity, recipe.groups) == (0, 2, (("H3", "H4"),))
    assert recipe.to_dict()["structure"] == {"smiles": "[CH2]O"}


def test_structure_is_relaxed_by_default(tmp_path: Path) -> None:
    assert load_recipe(_write(tmp_path, "[CH3]")).relax == Level("UKS", "pcseg-1", functional="B3LYP")


def test_relaxation_can_be_chosen_or_left_out(tmp_path: Path) -> None:
    assert load_recipe(_write(tmp_path, "[CH3]", "relax: false")).relax is False
    chosen = load_recipe(_write(tmp_path, "[CH3]", "relax: {functional: pbe}")).relax
    assert chosen == Level("UKS", "pcseg-1", functional="PBE")


def test_formal_charge_is_the_charge(tmp_path: Path) -> None:
    recipe = load_recipe(_write(tmp_path, "C=[O+]"))
    assert (recipe.charge, recipe.multiplicity) == (1, 2)


def test_another_charge_is_refused(tmp_path: Path) -> None:
    problem = _problem(_write(tmp_path, "C=[O+]", "charge: 0"))
    assert problem == ("3: charge: the structure has the formal charge +1; correct one of the two; found: +0")


def test_isotopes_of_the_drawing_count(tmp_path: Path) -> None:
    recipe = load_recipe(_write(tmp_path, "[13CH2]O", "isotopes: {H3: 2H}"))
    assert recipe.isotopes == {"C1": "13C", "H3": "2H"}


def test_spinless_isotope_of_the_drawing_is_refused(tmp_path: Path) -> None:
    assert _problem(_write(tmp_path, "[12CH3]")).startswith(
        '2: structure: C1: isotope "12C" has no nuclear spin'
    )


def test_isotope_that_contradicts_the_drawing_is_refused(tmp_path: Path) -> None:
    problem = _problem(_write(tmp_path, "[15NH2]", "isotopes: {N1: 14N}"))
    assert problem == "3: isotopes.N1: the structure says 15N; remove one of the two; found: 14N"


@pytest.mark.parametrize(
    ("smiles", "sentence"),
    [
        ("C(", 'smiles "C(": '),
        ("[CH3].[CH3]", "two molecules"),
        ("C" * 501, "is too long; allowed: 500 characters; found: 501"),
        ("", "is not text"),
    ],
)
def test_what_is_no_smiles_is_refused(tmp_path: Path, smiles: str, sentence: str) -> None:
    problem = _problem(_write(tmp_path, smiles))
    assert problem.startswith("2: structure.smiles: ")
    assert sentence in problem


def test_closed_shell_drawing_gets_the_lowest_multiplicity_above_one(tmp_path: Path) -> None:
    assert load_recipe(_write(tmp_path, "C=C")).multiplicity == 3
