"""From recipe files to Recipes: everything is checked before anything is raised."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

from ..errors import RecipeError, StructureError, nearest
from ..molecule import ATOMIC_NUMBER, Molecule
from ..structures.file import SUFFIXES, read_structure
from ..structures.geometry import Geometry
from ..structures.smiles import Drawing, read_smiles
from .document import NodeMap, Problems, Scalar, found, read_document
from .experiment import read_g, read_measured, read_temperature
from .features import not_built
from .levels import read_levels, read_relax, read_solvent
from .names import ALLOWED_NAME, is_name
from .nuclear import Atoms, read_groups, read_isotopes
from .recipe import Motion, Recipe
from .section import Section

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
    structure, smiles = _where(recipe)
    geometry: Geometry | Drawing | None = None
    if structure is not None:
        geometry = _geometry(recipe, path.parent / structure)
    elif smiles is not None:
        geometry = _drawing(recipe, smiles)
    elements = geometry.elements if geometry else None
    charge = _charge(recipe, geometry)
    multiplicity = _multiplicity(recipe, geometry, charge)
    levels = read_levels(recipe, elements)
    solvent = read_solvent(recipe)
    isotopes: dict[str, str] = {}
    groups: tuple[tuple[str, ...], ...] = ()
    atoms = None
    if geometry is not None:
        atoms = Atoms(geometry.elements)
        isotopes = read_isotopes(recipe, atoms, geometry.isotopes)
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
    if isinstance(geometry, Geometry):
        molecule = Molecule(geometry.elements, geometry.coordinates_bohr, charge, multiplicity)
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
            structure_comment=geometry.comment if isinstance(geometry, Geometry) else "",
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


def _where(recipe: Section) -> tuple[str | None, str | None]:
    """The path of the structure as written, or the SMILES."""
    allowed = f'a path ending in {", ".join(SUFFIXES)} (relative to the recipe), or {{smiles: "[CH3]"}}'
    if not recipe.require("structure", allowed):
        return None, None
    node = recipe.get("structure", "a structure", allowed)
    if isinstance(node, Scalar):
        return recipe.text("structure", allowed), None
    if not isinstance(node, NodeMap):
        if node is not None:
            recipe.refuse(
                "structure", f"is not a structure; allowed: {allowed}; found: {found(node)}", node.line
            )
        return None, None
    section = Section(node, "structure", recipe.problems, ("smiles",))
    if not section.require("smiles", 'text such as "[CH3]"'):
        return None, None
    return None, section.text("smiles", 'text such as "[CH3]"')


def _geometry(recipe: Section, path: Path) -> Geometry | None:
    if path.suffix.lower() not in SUFFIXES:
        recipe.refuse(
            "structure", f'is not a structure file; allowed: {", ".join(SUFFIXES)}; found: "{path.name}"'
        )
        return None
    if not _is_file(path):
        beside = [p.name for p in path.parent.glob("*") if p.suffix.lower() in SUFFIXES]
        recipe.refuse(
            "structure",
            f"there is no such file{nearest(path.name, beside)}; a path is relative to the recipe; "
            f'looked for: "{path}"',
        )
        return None
    try:
        return read_structure(path)
    except StructureError as error:
        recipe.refuse("structure", error.message)
        return None


def _is_file(path: Path) -> bool:
    try:
        return path.is_file()
    except OSError:  # a name that is too long for the system
        return False


def _drawing(recipe: Section, smiles: str) -> Drawing | None:
    try:
        return read_smiles(smiles)
    except StructureError as error:
        recipe.refuse("structure", error.message)
        return None


def _charge(recipe: Section, geometry: Geometry | Drawing | None) -> int | None:
    stated = geometry.charge if geometry else None
    if "charge" not in recipe:
        return stated or 0
    charge = recipe.integer("charge", "a whole number such as -1, 0 or 1")
    if charge is not None and stated is not None and stated != charge:
        recipe.refuse(
            "charge",
            f"the structure has the formal charge {stated:+d}; correct one of the two; found: {charge:+d}",
        )
        return None
    return charge


def _multiplicity(recipe: Section, geometry: Geometry | Drawing | None, charge: int | None) -> int | None:
    """2S+1, checked against the number of electrons."""
    rule = "2S+1, one more than the number of unpaired electrons"
    asked = recipe.integer("multiplicity", f"a whole number from 2 upwards ({rule})")
    if asked is not None and asked < 2:
        what = "means no unpaired electron" if asked == 1 else "is not a multiplicity"
        recipe.refuse(
            "multiplicity", f"{what}; allowed: a whole number from 2 upwards ({rule}); found: {asked}"
        )
        return None
    if "multiplicity" in recipe.refused or charge is None or geometry is None:
        return asked
    electrons = sum(ATOMIC_NUMBER[element] for element in geometry.elements) - charge
    if electrons < 1:
        recipe.refuse(
            "charge", f"leaves no electron; allowed: less than {electrons + charge:+d}; found: {charge:+d}"
        )
        return None
    lowest = 2 if electrons % 2 else 3
    if asked is None:
        asked = lowest
    fitting = [str(value) for value in range(lowest, electrons + 2, 2)]
    if str(asked) not in fitting:
        parity = "odd" if electrons % 2 else "even"
        options = ", ".join([*fitting[:3], "..."] if len(fitting) > 3 else fitting) or "none"
        recipe.refuse(
            "multiplicity",
            f"does not fit {electrons} electrons at charge {charge:+d} (an {parity} number); "
            f"allowed: {options} ({rule}); found: {asked}",
        )
        return None
    return asked


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
