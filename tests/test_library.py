"""The library of radicals: structures made from a drawing, couplings beside measured ones.

The measured values and their sources stand in the recipes; "from memory" is said there where nobody read them, and
rows that the compilation holds uncertain decide nothing. The limit was set before anything was computed: 15 % or
0.08 mT, whichever is larger, at UKS-B3LYP/pcH-1. Couplings that miss it are listed with the reason, and a test fails
as soon as one of them no longer misses.
"""

from __future__ import annotations

import dataclasses
import re
from functools import cache
from pathlib import Path

import pytest
from hits import MISSES, predicted_and_measured_mT

from unpaired.recipe.load import load_recipe
from unpaired.result import Result
from unpaired.settle import settle
from unpaired.structures.conformers import same_shape
from unpaired.structures.xyz import read_xyz
from unpaired.study import study

ROOT = Path(__file__).parent.parent
RADICALS = (
    "beryllium-cation",
    "carbon-dioxide-anion",
    "difluoride-anion",
    "dihydrogen-cation",
    "ethyl",
    "fluoromethyl",
    "formaldehyde-cation",
    "formyl",
    "helium-cation",
    "hydrazine-cation",
    "hydrogen",
    "lithium",
    "methyl",
    "nitrogen",
    "nitrogen-dioxide",
    "nitroxide",
    "silicon-boride",
    "vinyl",
)


def _cases() -> list[object]:
    found = []
    for name in RADICALS:
        for place, item in enumerate(load_recipe(ROOT / "recipes" / f"{name}.yaml").measured):
            if item.atoms is None or "for looking only" in item.source:
                continue
            first = item.atoms[0]
            reason = MISSES.get((name, first))
            marks = [pytest.mark.xfail(strict=True, reason=reason)] if reason else []
            found.append(pytest.param(name, place, id=f"{name} {first}", marks=marks))
    return found


@cache
def result(name: str) -> Result:
    """UKS-B3LYP/pcH-1, the recipe's last level."""
    recipe = load_recipe(ROOT / "recipes" / f"{name}.yaml")
    return study(dataclasses.replace(recipe, levels=recipe.levels[-1:]))


@pytest.mark.slow
@pytest.mark.parametrize(("name", "place"), _cases())
def test_a_measured_coupling_is_hit(name: str, place: int) -> None:
    predicted, measured = predicted_and_measured_mT(result(name), place)
    assert predicted == pytest.approx(measured, abs=max(0.15 * abs(measured), 0.08))


@pytest.mark.parametrize("path", sorted((ROOT / "molecules").glob("*.xyz")), ids=lambda path: path.stem)
def test_every_shipped_structure_says_how_it_was_made(path: Path) -> None:
    assert re.search("B3LYP/pcseg-[01]", read_xyz(path).comment)


@pytest.mark.parametrize("path", sorted((ROOT / "molecules").glob("*.xyz")), ids=lambda path: path.stem)
def test_every_shipped_structure_can_be_made_again(path: Path) -> None:
    """By `unpaired structure molecules/drawn/*.yaml`; the demo's are candidates of an invented case."""
    assert path.stem.startswith("demo-") or (ROOT / "molecules/drawn" / f"{path.stem}.yaml").exists()


@pytest.mark.parametrize(
    "path", sorted((ROOT / "molecules/drawn").glob("*.yaml")), ids=lambda path: path.stem
)
def test_every_drawing_can_be_read_and_has_the_atoms_of_its_structure(path: Path) -> None:
    recipe = load_recipe(path)
    structure = ROOT / "molecules" / f"{path.stem}.xyz"
    assert recipe.radical == path.stem
    if structure.exists() and recipe.smiles is not None:
        from unpaired.structures.smiles import read_smiles

        assert read_smiles(recipe.smiles).elements == read_xyz(structure).elements


@pytest.mark.slow
@pytest.mark.parametrize("name", ["formyl", "amidogen", "trifluoromethyl"])
def test_another_random_start_ends_in_the_shipped_minimum(name: str) -> None:
    """To 1e-5 Eh, as the project asks. CF3 turned in space changes by as much on a coarser final grid."""
    settled = settle(load_recipe(ROOT / "molecules/drawn" / f"{name}.yaml"), seed=7)
    shipped = read_xyz(ROOT / "molecules" / f"{name}.xyz")
    energy = float(shipped.comment.split(" Eh")[0].split()[-1])
    assert settled.conformers[0].energy_Eh == pytest.approx(energy, abs=1e-5)
    assert settled.minimum is True
    assert same_shape(
        shipped.elements, shipped.coordinates_bohr, settled.molecule.coordinates_bohr, tolerance=0.02
    )
