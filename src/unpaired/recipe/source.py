"""Where the atoms of a recipe come from: a structure file or a SMILES."""

from __future__ import annotations

from pathlib import Path

from ..errors import StructureError, nearest
from ..structures.file import SUFFIXES, read_structure
from ..structures.geometry import Geometry
from ..structures.smiles import Drawing, read_smiles
from .document import NodeMap, Scalar, found
from .section import Section

LONGEST_SMILES = 500


def read_source(recipe: Section, folder: Path) -> tuple[str | None, str | None, Geometry | Drawing | None]:
    """The structure path as written, the SMILES, and what was read there; None for what is not there or refused."""
    allowed = f'a path ending in {", ".join(SUFFIXES)} (relative to the recipe), or {{smiles: "[CH3]"}}'
    if not recipe.require("structure", allowed):
        return None, None, None
    node = recipe.get("structure", "a structure", allowed)
    if isinstance(node, NodeMap):
        smiles, drawing = _drawing(Section(node, "structure", recipe.problems, ("smiles",)))
        return None, smiles, drawing
    if isinstance(node, Scalar):
        path = recipe.text("structure", allowed)
        return path, None, _geometry(recipe, folder / path) if path else None
    if node is not None:
        recipe.refuse("structure", f"is not a structure; allowed: {allowed}; found: {found(node)}", node.line)
    return None, None, None


def _drawing(section: Section) -> tuple[str | None, Drawing | None]:
    allowed = 'text such as "[CH3]"'
    smiles = section.text("smiles", allowed) if section.require("smiles", allowed) else None
    if smiles is None:
        return None, None
    if len(smiles) > LONGEST_SMILES:
        section.refuse("smiles", f"is too long; allowed: {LONGEST_SMILES} characters; found: {len(smiles)}")
        return smiles, None
    try:
        return smiles, read_smiles(smiles)
    except StructureError as error:
        section.refuse("smiles", error.message)
        return smiles, None


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
