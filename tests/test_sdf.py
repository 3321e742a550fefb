"""SDF and MOL files, written here by RDKit (another implementation of the open format)."""

from pathlib import Path

import pytest
from rdkit import Chem
from rdkit.Chem import AllChem

from unpaired.errors import StructureError
from unpaired.structures.file import read_structure
from unpaired.structures.sdf import parse_sdf


@pytest.fixture(scope="module")
def ethyl() -> Chem.Mol:
    mol = Chem.AddHs(Chem.MolFromSmiles("[13CH2]C"))
    AllChem.EmbedMolecule(mol, randomSeed=1)
    return mol


@pytest.mark.parametrize("write", [Chem.MolToMolBlock, Chem.MolToV3KMolBlock])
def test_reads_what_rdkit_writes(ethyl: Chem.Mol, write: object, tmp_path: Path) -> None:
    path = tmp_path / "ethyl.sdf"
    path.write_text(write(ethyl))  # type: ignore[operator]
    geometry = read_structure(path)
    assert geometry.elements == ("C", "C", "H", "H", "H", "H", "H")
    assert geometry.charge == 0
    assert dict(geometry.isotopes) == {"C1": "13C"}


def test_charges_are_added_up() -> None:
    mol = Chem.AddHs(Chem.MolFromSmiles("[CH2]C(=O)[O-]"))
    AllChem.EmbedMolecule(mol, randomSeed=1)
    assert parse_sdf(Chem.MolToMolBlock(mol), "a.sdf").charge == -1


def _lines(mol: Chem.Mol) -> str:
    return str(Chem.MolToMolBlock(mol))


def test_refusals_name_file_and_line(ethyl: Chem.Mol) -> None:
    good = _lines(ethyl)
    flat = Chem.MolFromSmiles("CCCC[CH2]")
    AllChem.Compute2DCoords(flat)
    for text, message in [
        (good.replace(" C  ", " Xx ", 1), 'a.sdf:5: unknown element "Xx"'),
        (good[:200], "a.sdf:6: the file ends here, but line 4 says 7 atoms (to line 11)"),
        (f"{good}$$$$\n{good}", "a.sdf:22: a second structure begins; give one radical per file"),
        (
            good.replace("  2  6  1", "  2  6  3"),
            "a.sdf: line 6 (C2): Explicit valence for atom # 1 C, 6, is greater than permitted",
        ),
        ("a\nb\n", "a.sdf:3: the file ends before its counts line (line 4)"),
        (
            _lines(flat),
            "a.sdf: is a flat drawing, not a structure; give its SMILES instead (structure: {smiles: ...})",
        ),
        (
            good.replace("V2000", "V9"),
            "a.sdf:4: not a structure file (CTAB version string invalid at line 4)",
        ),
    ]:
        with pytest.raises(StructureError) as caught:
            parse_sdf(text, "a.sdf")
        assert caught.value.message == message


def test_overlapping_atoms_are_named_by_line(ethyl: Chem.Mol) -> None:
    lines = _lines(ethyl).split("\n")
    lines[10] = lines[9][:28] + "1" + lines[9][29:]
    with pytest.raises(StructureError, match=r"a.sdf: line 10 \(H6\) and line 11 \(H7\) overlap"):
        parse_sdf("\n".join(lines), "a.sdf")
