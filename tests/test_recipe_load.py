"""What a good recipe means."""

from __future__ import annotations

import json
import pickle
from pathlib import Path

import numpy as np
import pytest

from unpaired.constants import BOHR_ANGSTROM
from unpaired.errors import RecipeError
from unpaired.level import Level
from unpaired.recipe import MeasuredG, Motion, features, load_recipe, load_recipes
from unpaired.recipe.load import KEYS

GOOD = Path(__file__).parent / "recipes_good"
METHYL = GOOD / "structures" / "methyl.xyz"


def _write(folder: Path, *lines: str, name: str = "recipe.yaml") -> Path:
    path = folder / name
    path.write_text("\n".join(["radical: methyl", f"structure: {METHYL}", *lines]) + "\n", encoding="utf-8")
    return path


def _problems(path: Path) -> list[str]:
    with pytest.raises(RecipeError) as caught:
        load_recipe(path)
    return [problem.removeprefix(f"{path}:") for problem in caught.value.problems]


def test_nitric_oxide_keeps_its_name() -> None:
    assert load_recipe(GOOD / "NO.yaml").radical == "NO"


def test_the_two_good_recipes_use_every_key() -> None:
    used = {
        key for name in ("NO", "methyl") for key in KEYS if f"\n{key}:" in (GOOD / f"{name}.yaml").read_text()
    }
    assert used == set(KEYS)


def test_every_key_is_understood() -> None:
    recipe = load_recipe(GOOD / "NO.yaml")
    assert (recipe.charge, recipe.multiplicity) == (0, 2)
    assert recipe.levels == (
        Level("UHF", "pcH-1"),
        Level("ROHF", "pcH-1", accuracy="quick"),
        Level("UKS", "pcH-1", functional="B3LYP", name="B3LYP, as usual"),
        Level("ROKS", "pcH-2", functional="PBE0", accuracy="reference"),
    )
    assert recipe.solvent is not None
    assert recipe.solvent.name == "water"
    assert recipe.isotopes == {"N1": "15N", "O2": "17O"}
    assert recipe.relax is False
    assert recipe.motion == Motion(rotors=True, inversion=False, torsion=False, vibration=False)
    assert (recipe.temperature_K, recipe.temperature_assumed) == (298.0, False)
    assert recipe.g == MeasuredG(1.99, "invented")
    assigned, unassigned = recipe.measured
    assert (assigned.atoms, assigned.count, assigned.coupling_mT, assigned.sign) == (("N1",), 1, 1.0, "+")
    assert (unassigned.atoms, unassigned.count, unassigned.coupling_mT) == (None, 2, 1e-8)
    assert unassigned.sign == "unknown"


def test_structure_is_read_relative_to_the_recipe(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.chdir(tmp_path)
    molecule = load_recipe(GOOD / "NO.yaml").molecule
    assert molecule is not None
    assert molecule.labels == ("N1", "O2")
    np.testing.assert_allclose(molecule.coordinates_bohr[1], [0, 0, 1.15 / BOHR_ANGSTROM], rtol=1e-14)


def test_what_the_structure_file_says_about_itself_is_kept() -> None:
    comment = load_recipe(GOOD / "NO.yaml").structure_comment
    assert comment == "nitric oxide at 1.15 angstrom, for tests of recipes only"


def test_user_groups_and_dielectric_constant() -> None:
    recipe = load_recipe(GOOD / "methyl.yaml")
    assert recipe.groups == (("H2", "H3"),)
    assert recipe.solvent is not None
    assert recipe.solvent.dielectric == 7.2


def test_default_levels_are_exactly_three(tmp_path: Path) -> None:
    ids = [level.id for level in load_recipe(_write(tmp_path)).levels]
    assert ids == ["UHF/pcH-1", "ROHF/pcH-1", "UKS-B3LYP/pcH-1"]


def test_defaults(tmp_path: Path) -> None:
    recipe = load_recipe(_write(tmp_path))
    assert (recipe.charge, recipe.multiplicity) == (0, 2)
    assert recipe.solvent is None
    assert (recipe.isotopes, recipe.groups, recipe.measured, recipe.g) == ({}, (), (), None)
    assert recipe.relax is False
    assert recipe.motion == Motion(rotors=True, inversion=False, torsion=False, vibration=False)
    assert (recipe.temperature_K, recipe.temperature_assumed) == (298.0, True)


@pytest.mark.parametrize(("charge", "multiplicity"), [(0, 2), (1, 3), (-1, 3), (2, 2)])
def test_default_multiplicity_is_the_lowest_above_one(tmp_path: Path, charge: int, multiplicity: int) -> None:
    assert load_recipe(_write(tmp_path, f"charge: {charge}")).multiplicity == multiplicity


@pytest.mark.parametrize("multiplicity", [2, 4, 6, 8, 10])
def test_methyl_with_nine_electrons_takes_even_multiplicities(tmp_path: Path, multiplicity: int) -> None:
    assert load_recipe(_write(tmp_path, f"multiplicity: {multiplicity}")).multiplicity == multiplicity


@pytest.mark.parametrize("multiplicity", [3, 5, 7, 9, 11, 12])
def test_methyl_refuses_other_multiplicities(tmp_path: Path, multiplicity: int) -> None:
    (problem,) = _problems(_write(tmp_path, f"multiplicity: {multiplicity}"))
    assert "does not fit 9 electrons" in problem


@pytest.mark.parametrize(
    "word", ["NO", "No", "no", "ON", "Off", "yes", "true", "1e3", "012", "2", "1_0", "CH3."]
)
def test_a_name_is_taken_as_written(tmp_path: Path, word: str) -> None:
    path = tmp_path / "recipe.yaml"
    path.write_text(f"radical: {word}\nstructure: {METHYL}\n")
    assert load_recipe(path).radical == word


@pytest.mark.parametrize(("text", "value"), [("77", 77.0), ("1e2", 100.0), ("1E+2", 100.0), ("4.2", 4.2)])
def test_numbers(tmp_path: Path, text: str, value: float) -> None:
    assert load_recipe(_write(tmp_path, f"temperature_K: {text}")).temperature_K == value


@pytest.mark.parametrize("name", ["a", "a" * 80, "1,3-butadiene (s-trans) anion_2 + x.y"])
def test_usable_names(tmp_path: Path, name: str) -> None:
    path = tmp_path / "recipe.yaml"
    path.write_text(f'radical: "{name}"\nstructure: {METHYL}\n')
    assert load_recipe(path).radical == name


@pytest.mark.parametrize(
    "name", ["", " ", ".", "..", ".a", " a", "a ", "a/b", "a\\b", "ä", "a:b", "a*", "a" * 81]
)
def test_unusable_names(tmp_path: Path, name: str) -> None:
    path = tmp_path / "recipe.yaml"
    path.write_text(f"radical: '{name}'\nstructure: {METHYL}\n", encoding="utf-8")
    (problem,) = _problems(path)
    assert problem.startswith("1: radical: ")


def test_sign_may_stand_in_the_number_or_beside_it(tmp_path: Path) -> None:
    recipe = load_recipe(
        _write(
            tmp_path,
            "measured:",
            '  - {atoms: [H2], coupling_mT: -2.3, sign: "-", source: invented}',
            '  - {atoms: [H3], coupling_mT: 2.3, sign: "-", source: invented}',
        )
    )
    assert [value.coupling_mT for value in recipe.measured] == [-2.3, -2.3]
    assert [value.count for value in recipe.measured] == [1, 1]


def test_byte_order_mark_and_windows_line_ends_are_fine(tmp_path: Path) -> None:
    path = tmp_path / "recipe.yaml"
    path.write_bytes(b"\xef\xbb\xbf" + f"radical: methyl\r\nstructure: {METHYL}\r\n".encode())
    assert load_recipe(path).radical == "methyl"


def test_all_problems_come_at_once_in_the_order_of_lines(tmp_path: Path) -> None:
    path = _write(tmp_path, "multiplicity: 1", "solvnt: water", "levels: [{scf: UKS}]", "temperature_K: 0")
    starts = [" ".join(problem.split(" ")[:2]) for problem in _problems(path)]
    assert starts == [
        "3: multiplicity:",
        "4: solvnt:",
        "5: levels[1].functional:",
        "5: levels[1].basis:",
        "6: temperature_K:",
    ]


def test_one_mistake_is_one_problem(tmp_path: Path) -> None:
    assert len(_problems(_write(tmp_path, "charge: none"))) == 1


@pytest.mark.parametrize(
    ("line", "feature", "address"),
    [
        ("motion: {rotors: false}", "motion.rotors", "motion.rotors"),
        ("motion: {inversion: true}", "motion.inversion", "motion.inversion"),
        ("motion: {torsion: true}", "motion.torsion", "motion.torsion"),
        ("motion: {vibration: true}", "motion.vibration", "motion.vibration"),
    ],
)
def test_features_that_are_not_built_are_refused_with_a_sentence(
    tmp_path: Path, line: str, feature: str, address: str
) -> None:
    path = _write(tmp_path, line)
    if feature in features.NOT_BUILT:
        (problem,) = _problems(path)
        assert problem.startswith(
            f"3: {address}: is understood, but {features.NOT_BUILT[feature]} has not been built"
        )
    else:
        load_recipe(path)


def test_relaxation_of_a_file_is_asked_for(tmp_path: Path) -> None:
    assert load_recipe(_write(tmp_path, "relax: true")).relax == Level("UKS", "pcseg-1", functional="B3LYP")
    chosen = load_recipe(_write(tmp_path, "relax: {functional: pbe, basis: pcseg-0}")).relax
    assert chosen == Level("UKS", "pcseg-0", functional="PBE")


def test_switched_off_features_are_not_refused(tmp_path: Path) -> None:
    lines = ("relax: false", "motion: {rotors: true, inversion: false, torsion: false, vibration: false}")
    assert load_recipe(_write(tmp_path, *lines)).relax is False


def test_two_recipes_with_one_name_are_refused(tmp_path: Path) -> None:
    first = _write(tmp_path, name="a.yaml")
    second = tmp_path / "b.yaml"
    second.write_text(f"structure: {METHYL}\nradical: Methyl\n")
    with pytest.raises(RecipeError) as caught:
        load_recipes([first, second])
    (problem,) = caught.value.problems
    assert problem.startswith(f"{second}:2: radical: {first} has the same name")


def test_problems_of_all_recipes_come_together(tmp_path: Path) -> None:
    first = _write(tmp_path, "charge: x", name="a.yaml")
    with pytest.raises(RecipeError) as caught:
        load_recipes([first, tmp_path / "none.yaml", GOOD / "NO.yaml"])
    assert [problem.split(": ")[0] for problem in caught.value.problems] == [
        f"{first}:3",
        f"{tmp_path / 'none.yaml'}:1",
    ]


def test_recipes_come_back_in_the_order_given() -> None:
    paths = [GOOD / "methyl.yaml", GOOD / "NO.yaml"]
    assert [recipe.path for recipe in load_recipes(paths)] == paths


@pytest.mark.parametrize(
    ("make", "sentence"),
    [
        (lambda path: None, "there is no such file"),
        (lambda path: path.mkdir(), "is a folder"),
        (lambda path: path.write_bytes(b"# " + b"x" * 200_000), "is too large for a recipe"),
        (lambda path: path.write_bytes(b""), "is empty"),
    ],
    ids=["missing", "folder", "huge", "empty"],
)
def test_what_is_no_recipe_file(tmp_path: Path, make, sentence: str) -> None:  # type: ignore[no-untyped-def]
    path = tmp_path / "recipe.yaml"
    make(path)
    (problem,) = _problems(path)
    assert problem.startswith(f"1: {sentence}")


def test_a_device_is_not_read() -> None:
    (problem,) = _problems(Path("/dev/zero"))
    assert problem.startswith("1: is not a regular file")


def test_the_recipe_as_understood_is_plain_data_without_absolute_paths(tmp_path: Path) -> None:
    recipe = load_recipe(GOOD / "NO.yaml")
    data = recipe.to_dict()
    assert json.loads(json.dumps(data, allow_nan=False)) == data
    assert str(GOOD) not in json.dumps(data)
    assert data["structure"] == "structures/nitric-oxide.xyz"
    assert [level["id"] for level in data["levels"]] == [level.id for level in recipe.levels]


def test_a_recipe_survives_pickling() -> None:
    recipe = load_recipe(GOOD / "NO.yaml")
    assert pickle.loads(pickle.dumps(recipe)).to_dict() == recipe.to_dict()
