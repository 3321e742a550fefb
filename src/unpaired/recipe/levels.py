"""The levels of a recipe, the level of relaxation and the solvent, checked against what the engine has."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import Literal

from .. import catalogue
from ..errors import ChoiceError
from ..level import ACCURACIES, KOHN_SHAM, METHODS, Level
from ..point import Solvent
from .document import NodeMap, Scalar, found
from .features import not_built
from .names import ALLOWED_NAME, is_name
from .section import Section

LEVEL_KEYS = ("scf", "functional", "basis", "accuracy", "name", "solution")
RELAX_KEYS = ("functional", "basis")

DEFAULT_LEVELS = (
    Level("UHF", "pcH-1"),
    Level("ROHF", "pcH-1"),
    Level("UKS", "pcH-1", functional="B3LYP"),
)
DEFAULT_RELAX = Level("UKS", "pcseg-1", functional="B3LYP")

LONGEST_NAME = 200

_LIST = "a list such as [{scf: UHF, basis: pcH-1}]"


def read_levels(recipe: Section, elements: Sequence[str] | None) -> tuple[Level, ...]:
    """The levels asked for, or the default three; ids are unique.

    `elements` are those of the molecule, None if it could not be read: then only the names are checked.
    """
    if "levels" not in recipe:
        for default in DEFAULT_LEVELS:
            _check_default(recipe, default, elements)
        return DEFAULT_LEVELS
    levels: list[Level] = []
    for section in recipe.sections("levels", LEVEL_KEYS, _LIST):
        level = _level(section, elements)
        if level is None:
            continue
        if level.id in (other.id for other in levels):
            section.refuse(
                "name" if level.name else "scf",
                f'a level with the id "{level.id}" stands above; allowed: different ids; '
                "remove one or give it another `name`",
            )
        levels.append(level)
    return tuple(levels)


def _level(section: Section, elements: Sequence[str] | None) -> Level | None:
    scf = None
    if section.require("scf", ", ".join(METHODS)):
        scf = section.choice("scf", METHODS, None)
    functional = _functional(section, scf)
    basis = None
    if section.require("basis", "the name of a basis set, such as pcH-1"):
        basis = read_basis(section, elements)
    accuracy = section.choice("accuracy", ACCURACIES, "standard")
    name = section.text("name", ALLOWED_NAME)
    if name is not None and not is_name(name):
        section.refuse("name", f'is not a usable name; allowed: {ALLOWED_NAME}; found: "{name}"')
    solution = _solution(section)
    if scf is None or basis is None or accuracy is None or section.refused:
        return None
    return Level(scf, basis, functional, accuracy, name, solution)


def _functional(section: Section, scf: str | None) -> str | None:
    if scf is None:
        return None
    if scf not in KOHN_SHAM:
        if "functional" in section:
            section.refuse("functional", f"{scf} has no functional; remove it, or use scf: UKS or ROKS")
        return None
    if not section.require("functional", f"with {scf} a density functional, such as B3LYP"):
        return None
    return ask(section, "functional", catalogue.functional_name)


def _solution(section: Section) -> int | str | None:
    allowed = "a place from 1 upwards (by energy) or the label of a state"
    node = section.get("solution", "a solution", allowed)
    if node is None:
        return None
    if refusal := not_built("levels.solution"):
        section.refuse("solution", refusal)
        return None
    value = node.value if isinstance(node, Scalar) else None
    if isinstance(value, str) and value.strip():
        return value
    if isinstance(value, int) and not isinstance(value, bool) and value >= 1:
        return value
    section.refuse("solution", f"is not a solution; allowed: {allowed}; found: {found(node)}", node.line)
    return None


def ask(section: Section, key: str, question: Callable[[str], str]) -> str | None:
    """What the catalogue answers about a text, a ChoiceError noted as a problem of the key."""
    text = section.text(key)
    if text is None:
        return None
    if len(text) > LONGEST_NAME:
        section.refuse(
            key, f"is too long for a name; allowed: {LONGEST_NAME} characters; found: {len(text)} characters"
        )
        return None
    try:
        return question(text)
    except ChoiceError as error:
        section.refuse(key, error.message)
        return None


def read_basis(section: Section, elements: Sequence[str] | None) -> str | None:
    """The canonical name of a basis set that has every element, cores included."""
    name = ask(section, "basis", catalogue.basis_name)
    if name is None or elements is None:
        return name
    problem = _basis_problem(name, elements)
    if problem:
        section.refuse("basis", problem)
        return None
    return name


def _basis_problem(name: str, elements: Sequence[str]) -> str | None:
    """Why a basis set cannot be used for these elements, or None."""
    try:
        catalogue.check_basis(name, tuple(dict.fromkeys(elements)))
    except ChoiceError as error:
        return error.message
    return None


def _check_default(recipe: Section, level: Level, elements: Sequence[str] | None) -> None:
    """The default levels may lack an element as well: then the recipe has to name levels."""
    problem = _basis_problem(level.basis, elements) if elements is not None else None
    if problem:
        recipe.refuse("levels", f"is missing, and the default does not fit: {problem}")


def read_relax(recipe: Section, elements: Sequence[str] | None, from_smiles: bool) -> Literal[False] | Level:
    """The level of relaxation, or False: by default True for SMILES and False for a file."""
    allowed = "true, false or {functional: B3LYP, basis: pcseg-1}"
    node = recipe.get("relax", "a choice", allowed)
    level: Literal[False] | Level
    if isinstance(node, NodeMap):
        section = Section(node, "relax", recipe.problems, RELAX_KEYS)
        functional = ask(section, "functional", catalogue.functional_name) or DEFAULT_RELAX.functional
        basis = read_basis(section, elements) or DEFAULT_RELAX.basis
        level = Level("UKS", basis, functional)
    elif node is None:
        level = DEFAULT_RELAX if from_smiles else False
    elif isinstance(node, Scalar) and isinstance(node.value, bool):
        level = DEFAULT_RELAX if node.value else False
    else:
        recipe.refuse("relax", f"is not a choice; allowed: {allowed}; found: {found(node)}", node.line)
        return False
    return level


def read_solvent(recipe: Section) -> Solvent | None:
    """The continuum, None for the gas phase."""
    allowed = (
        "the name of a solvent or a dielectric constant of at least 1 (digits without quotes, such as 78.4); "
        "leave the key out for the gas phase"
    )
    node = recipe.get("solvent", "a solvent", allowed)
    if node is None:
        return None
    value = node.value if isinstance(node, Scalar) else None
    if isinstance(value, str):
        named = not _looks_like_a_number(value)
    else:
        named = isinstance(value, int | float) and not isinstance(value, bool) and 1 <= value < math.inf
    if value is None or not named:
        recipe.refuse("solvent", f"is not a solvent; allowed: {allowed}; found: {found(node)}", node.line)
        return None
    try:
        return catalogue.solvent(value)
    except ChoiceError as error:
        recipe.refuse("solvent", error.message)
        return None


def _looks_like_a_number(text: str) -> bool:
    """True for what Python would take for a number and a recipe does not: 7_8, 012, .5, nan."""
    try:
        float(text)
    except ValueError:
        return False
    return True
