"""SDF and MOL files (V2000 and V3000), read through RDKit and checked strictly."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import numpy as np

from ..constants import BOHR_ANGSTROM
from ..errors import StructureError
from .distances import check_distances
from .geometry import Geometry, structure_text
from .quiet import rdkit_messages
from .xyz import element_symbol

_SEPARATOR = "$$$$"
_FIRST_ATOM_LINE = 5
"""V2000: three lines of header, one of counts, then the atoms."""


def read_sdf(path: str | Path) -> Geometry:
    """Read the one structure of an SDF or MOL file.

    Formal charges add up to `charge`; isotope labels become `isotopes`. Raises StructureError with file and
    line for several structures, drawings without depth, wrong valences, overlapping atoms, two molecules.
    """
    return parse_sdf(structure_text(path), str(path))


def parse_sdf(text: str, name: str) -> Geometry:
    """The structure in the text of an SDF or MOL file; `name` stands in error messages."""
    block, _, rest = text.partition(_SEPARATOR)
    if rest.strip():
        line = block.count("\n") + 2
        raise StructureError(f"{name}:{line}: a second structure begins; give one radical per file")
    lines = block.splitlines()
    numbers = _atom_lines(lines, name)
    for number in numbers:
        fields = lines[number - 1].split()
        symbol = fields[3] if len(fields) > 3 else ""
        element_symbol(symbol, f"{name}:{number}")
    mol = _rdkit_molecule(block, name)
    if mol.GetNumAtoms() != len(numbers):
        raise StructureError(f"{name}: the atoms cannot be told apart; write the file as V2000")
    elements = tuple(atom.GetSymbol() for atom in mol.GetAtoms())

    def where(atom: int) -> str:
        return f"line {numbers[atom]} ({elements[atom]}{atom + 1})"

    angstrom = np.array(mol.GetConformer().GetPositions())
    if len(elements) > 3 and not angstrom[:, 2].any():
        _refuse_drawing(mol, name)
    _check_valences(mol, name, where)
    try:
        check_distances(elements, angstrom, where)
    except StructureError as error:
        raise StructureError(f"{name}: {error.message}") from None
    isotopes = {
        f"{atom.GetSymbol()}{atom.GetIdx() + 1}": f"{atom.GetIsotope()}{atom.GetSymbol()}"
        for atom in mol.GetAtoms()
        if atom.GetIsotope()
    }
    charge = sum(atom.GetFormalCharge() for atom in mol.GetAtoms())
    return Geometry(elements, angstrom / BOHR_ANGSTROM, lines[0].strip(), charge, isotopes)


def _atom_lines(lines: list[str], name: str) -> list[int]:
    """1-based line numbers of the atoms."""
    if len(lines) < 4:
        raise StructureError(f"{name}:{len(lines) + 1}: the file ends before its counts line (line 4)")
    if "V3000" in lines[3]:
        begin = [i for i, line in enumerate(lines) if line.split()[:4] == ["M", "V30", "BEGIN", "ATOM"]]
        end = [i for i, line in enumerate(lines) if line.split()[:4] == ["M", "V30", "END", "ATOM"]]
        if len(begin) != 1 or len(end) != 1:
            raise StructureError(f"{name}:5: a V3000 file with one block of atoms is expected")
        # Fields are M, V30, place, element, x, y, z: the element stands fourth as in V2000.
        return list(range(begin[0] + 2, end[0] + 1))
    count = lines[3][:3].strip()
    if not re.fullmatch(r"\d+", count) or int(count) == 0:
        raise StructureError(f'{name}:4: the number of atoms is expected in columns 1 to 3, found "{count}"')
    last = _FIRST_ATOM_LINE + int(count) - 1
    if last > len(lines):
        raise StructureError(
            f"{name}:{len(lines)}: the file ends here, but line 4 says {count} atoms (to line {last})"
        )
    return list(range(_FIRST_ATOM_LINE, last + 1))


def _rdkit_molecule(block: str, name: str) -> Any:
    from rdkit import Chem

    with rdkit_messages() as messages:
        mol = Chem.MolFromMolBlock(block, sanitize=False, removeHs=False)
    if mol is None:
        reason = "; ".join(messages) or "it cannot be read"
        line = re.search(r"line (\d+)", reason)
        raise StructureError(f"{name}{':' + line[1] if line else ''}: not a structure file ({reason})")
    return mol


def _refuse_drawing(mol: Any, name: str) -> None:
    """Flat coordinates are fine for a planar molecule, but not for a drawing."""
    if not mol.GetConformer().Is3D():
        raise StructureError(
            f"{name}: is a flat drawing, not a structure; give its SMILES instead "
            "(structure: {smiles: ...})"
        )


def _check_valences(mol: Any, name: str, where: Any) -> None:
    """Too many bonds at an atom; too few are a radical's right."""
    from rdkit import Chem

    with rdkit_messages():
        problems = Chem.DetectChemistryProblems(mol)
    for problem in problems:
        if problem.GetType() == "AtomValenceException":
            raise StructureError(f"{name}: {where(problem.GetAtomIdx())}: {problem.Message()}")
