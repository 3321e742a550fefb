"""The shipped recipes load, and their assignments fit the structures."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from unpaired.recipe import Recipe, load_recipe, load_recipes

ROOT = Path(__file__).parent.parent
SHIPPED = sorted((ROOT / "recipes").glob("**/*.yaml"))


def _bonded(recipe: Recipe, label: str) -> set[str]:
    """Labels within 1.7 angstrom (1.3 to hydrogen): enough for the molecules here."""
    molecule = recipe.molecule
    assert molecule is not None
    atom = molecule.labels.index(label)
    distances = np.linalg.norm(molecule.coordinates_angstrom - molecule.coordinates_angstrom[atom], axis=1)
    return {
        other
        for other, distance in zip(molecule.labels, distances, strict=True)
        if other != label and distance < (1.3 if "H" in (other[0], label[0]) else 1.7)
    }


@pytest.mark.parametrize("path", SHIPPED, ids=lambda path: path.stem)
def test_shipped_recipe_loads(path: Path) -> None:
    assert load_recipe(path).molecule is not None


def test_shipped_recipes_can_run_together() -> None:
    assert len(load_recipes(SHIPPED)) == len(SHIPPED)


@pytest.mark.parametrize(
    ("name", "bonds"),
    [
        ("methyl", {"C1": {"H2", "H3", "H4"}}),
        ("ethyl", {"C1": {"C2", "H3", "H4"}, "C2": {"C1", "H5", "H6", "H7"}}),
        ("allyl", {"C1": {"C2", "H4", "H5"}, "C2": {"C1", "C3", "H6"}, "C3": {"C2", "H7", "H8"}}),
        (
            "phenyl",
            {
                "C1": {"C2", "C6"},
                "C2": {"C1", "C3", "H7"},
                "C3": {"C2", "C4", "H8"},
                "C4": {"C3", "C5", "H9"},
                "C5": {"C4", "C6", "H10"},
                "C6": {"C5", "C1", "H11"},
            },
        ),
        ("amidogen", {"N1": {"H2", "H3"}}),
        ("nitroxide", {"N1": {"O2", "H3", "H4"}}),
        ("trifluoromethyl", {"C1": {"F2", "F3", "F4"}}),
        ("pyrazine-anion", {"N1": {"C2", "C6"}, "N4": {"C3", "C5"}}),
    ],
)
def test_labels_of_the_recipe_are_those_of_the_structure(name: str, bonds: dict[str, set[str]]) -> None:
    recipe = load_recipe(ROOT / "recipes" / f"{name}.yaml")
    assert {label: _bonded(recipe, label) for label in bonds} == bonds


def test_larger_terminal_coupling_of_allyl_is_given_to_the_outer_protons() -> None:
    recipe = load_recipe(ROOT / "recipes" / "allyl.yaml")
    assert recipe.molecule is not None
    place = dict(zip(recipe.molecule.labels, recipe.molecule.coordinates_bohr, strict=True))
    larger, smaller = recipe.measured[0], recipe.measured[1]
    assert (larger.atoms, smaller.atoms) == (("H4", "H7"), ("H5", "H8"))
    for outer, inner, far_end in (("H4", "H5", "C3"), ("H7", "H8", "C1")):
        assert np.linalg.norm(place[outer] - place[far_end]) > np.linalg.norm(place[inner] - place[far_end])
