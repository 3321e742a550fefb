"""From recipe files to Recipes: everything is checked before anything is raised."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

from ..errors import RecipeError
from ..molecule import Molecule
from ..structures.geometry import Geometry
from .document import Problems, read_document
from .electrons import read_charge, read_multiplicity
from .experiment import read_g, read_measured, read_temperature
from .features import not_built
from .levels import read_levels, read_relax, read_solvent
from .names import ALLOWED_NAME, is_name
from .nuclear import Atoms, read_groups, read_isotopes
from .recipe import Motion, Recipe
from .section import Section
from .source import read_source

KEYS = (
    "radical",
    "structure",
    "charge",
    "multiplicity",
    "levels",
    "solvent",
    "isotopes",
    "groups",
    "relax",
    "motion",
    "temperature_K",
    "g",
    "measured",
)
MOTION_KEYS = ("rotors", "inversion", "torsion", "vibration")
DEFAULT_TEMPERATURE_K = 298.0


def load_recipe(path: str | Path) -> Recipe:
    """Read and validate one recipe.

    Raises RecipeError whose `problems` are all that is wrong, each as `file:line: key: sentence`.
    """
    return load_recipes([path])[0]


def load_recipes(paths: Iterable[str | Path]) -> tuple[Recipe, ...]:
    """Read and validate recipes that run together: no two may have the same name (the name is a folder).

    Raises RecipeError with the problems of all of them.
    """
    recipes: list[Recipe] = []
    sentences: list[str] = []
    owners: dict[str, Path] = {}
    for path in map(Path, paths):
        problems = Problems(str(path))
        recipe, name, line = _read(path, problems)
        if name is not None:
            owner = owners.setdefault(name.casefold(), path)
            if owner is not path:
                problems.add(
                    line,
                    "radical",
                    f"{owner} has the same name (large and small letters count as the same, because the name "
                    f'is a folder); allowed: different names; found: "{name}"',
                )
        sentences.extend(problems.sentences())
        if recipe is not None:
            recipes.append(recipe)
    if sentences:
        raise RecipeError(problems=sentences)
    return tuple(recipes)


def _read(path: Path, problems: Problems) -> tuple[Recipe | None, str | None, int]:
    """The recipe (None if it has problems), its name and the line of the name."""
    top = read_document(path, problems)
    if top is None:
        return None, None, 1
    recipe = Section(top, "", problems, KEYS)
    name = _name(recipe)
    structure, smiles, source = read_source(recipe, path.parent)
    elements = source.elements if source else None
    charge = read_charge(recipe, source)
    multiplicity = read_multiplicity(recipe, elements, charge)
    levels = read_levels(recipe, elements)
    solvent = read_solvent(recipe)
    isotopes: dict[str, str] = {}
    groups: tuple[tuple[str, ...], ...] = ()
    atoms = None
    if source is not None:
        atoms = Atoms(source.elements)
        isotopes = read_isotopes(recipe, atoms, source.isotopes)
        groups = read_groups(recipe, atoms)
    relax = read_relax(recipe, elements, from_smiles=smiles is not None)
    motion = _motion(recipe)
    temperature = read_temperature(recipe)
    g = read_g(recipe)
    measured = read_measured(recipe, atoms)
    line = recipe.line("radical")
    if problems.found or name is None or charge is None or multiplicity is None:
        return None, name, line
    molecule = None
    if isinstance(source, Geometry):
        molecule = Molecule(source.elements, source.coordinates_bohr, charge, multiplicity)
    return (
        Recipe(
            radical=name,
            path=path,
            structure=structure,
            smiles=smiles,
            molecule=molecule,
            charge=charge,
            multiplicity=multiplicity,
            levels=levels,
            structure_comment=source.comment if isinstance(source, Geometry) else "",
            solvent=solvent,
            isotopes=isotopes,
            groups=groups,
            relax=relax,
            motion=motion,
            temperature_K=DEFAULT_TEMPERATURE_K if temperature is None else temperature,
            temperature_assumed=temperature is None,
            g=g,
            measured=measured,
        ),
        name,
        line,
    )


def _name(recipe: Section) -> str | None:
    if not recipe.require("radical", ALLOWED_NAME):
        return None
    name = recipe.text("radical", ALLOWED_NAME)
    if name is None or is_name(name):
        return name
    recipe.refuse("radical", f'is not a usable name; allowed: {ALLOWED_NAME}; found: "{name[:100]}"')
    return None


def _motion(recipe: Section) -> Motion:
    defaults = Motion()
    section = recipe.section(
        "motion", MOTION_KEYS, "{" + ", ".join(f"{key}: true" for key in MOTION_KEYS) + "}"
    )
    if section is None:
        return defaults
    values = {}
    for key in MOTION_KEYS:
        default = getattr(defaults, key)
        values[key] = section.boolean(key, default)
        refusal = not_built(f"motion.{key}")
        if values[key] != default and refusal:
            section.refuse(key, refusal)
    return Motion(**values)
