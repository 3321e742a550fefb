"""From a SMILES to atoms: elements, charge, isotopes, and what the drawing says about equivalence."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from ..errors import StructureError
from ..molecule import ATOMIC_NUMBER
from .quiet import rdkit_messages


@dataclass(frozen=True, eq=False)
class Drawing:
    """A radical as drawn: atoms and bonds without positions. Hydrogens are atoms of their own, after the rest."""

    smiles: str
    elements: tuple[str, ...]
    charge: int
    """Sum of the formal charges."""
    open_valences: int
    """Unpaired electrons as drawn."""
    isotopes: dict[str, str]
    """Isotopes named in the SMILES by atom label: {"C1": "13C"}."""
    classes: tuple[int, ...]
    """Atoms with the same number are the same on paper (isotopes not counted)."""
    bonds: tuple[tuple[int, int, float], ...]
    """Atom, atom, bond order (1.5 for aromatic)."""
    mol: Any = field(repr=False)
    """The RDKit molecule with its hydrogens."""
    stereocentres: bool = False
    """True if it has a centre of handedness, drawn or not: atoms that look alike on paper may then differ."""

    @property
    def labels(self) -> tuple[str, ...]:
        """Element and 1-based place, such as C1 or H4."""
        return tuple(f"{element}{place}" for place, element in enumerate(self.elements, start=1))


def read_smiles(smiles: str) -> Drawing:
    """Read a SMILES, radicals and ions included; every hydrogen becomes an atom.

    Raises StructureError for text that is no SMILES, for more than one molecule, for atoms that are no elements.
    """
    from rdkit import Chem

    with rdkit_messages() as messages:
        mol = Chem.MolFromSmiles(smiles)
    if mol is None:
        reason = next((text for text in messages if text), "it cannot be read").splitlines()[0]
        raise StructureError(f'smiles "{smiles}": {reason}')
    if mol.GetNumAtoms() == 0:
        raise StructureError(f'smiles "{smiles}": there is no atom in it')
    if len(Chem.GetMolFrags(mol)) > 1:
        raise StructureError(f'smiles "{smiles}": the dot makes it two molecules; give one radical')
    mol = Chem.AddHs(mol)
    centres: Any = Chem.FindMolChiralCenters  # untyped in RDKit
    elements = tuple(atom.GetSymbol() for atom in mol.GetAtoms())
    for element in elements:
        if element not in ATOMIC_NUMBER:
            raise StructureError(f'smiles "{smiles}": "{element}" is not an element')
    return Drawing(
        smiles=smiles,
        elements=elements,
        charge=Chem.GetFormalCharge(mol),
        open_valences=sum(atom.GetNumRadicalElectrons() for atom in mol.GetAtoms()),
        isotopes={
            f"{atom.GetSymbol()}{atom.GetIdx() + 1}": f"{atom.GetIsotope()}{atom.GetSymbol()}"
            for atom in mol.GetAtoms()
            if atom.GetIsotope()
        },
        classes=_classes(mol),
        bonds=tuple(
            (bond.GetBeginAtomIdx(), bond.GetEndAtomIdx(), bond.GetBondTypeAsDouble())
            for bond in mol.GetBonds()
        ),
        mol=mol,
        stereocentres=bool(centres(mol, includeUnassigned=True, useLegacyImplementation=False)),
    )


def _classes(mol: Any) -> tuple[int, ...]:
    """Classes of atoms that the bonds cannot tell apart.

    Bond orders, charges and open valences are left out, so that the resonance forms of allyl or of a radical ion do
    not tell its ends apart.
    """
    from rdkit import Chem

    plain = Chem.RWMol(mol)
    for atom in plain.GetAtoms():
        atom.SetIsotope(0)
        atom.SetFormalCharge(0)
        atom.SetNumRadicalElectrons(0)
        atom.SetIsAromatic(False)
        atom.SetNoImplicit(True)
        atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    for bond in plain.GetBonds():
        bond.SetBondType(Chem.BondType.SINGLE)
        bond.SetIsAromatic(False)
        bond.SetStereo(Chem.BondStereo.STEREONONE)
    plain.UpdatePropertyCache(strict=False)
    return tuple(Chem.CanonicalRankAtoms(plain, breakTies=False, includeChirality=False))
