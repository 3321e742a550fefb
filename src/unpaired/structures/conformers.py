"""Starting structures of a drawing, and which relaxed structures are one and the same."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations_with_replacement
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import StructureError
from ..molecule import Molecule
from .distances import COVALENT_RADIUS_ANGSTROM, distance_matrix, neighbours
from .quiet import rdkit_messages
from .smiles import Drawing

Floats = NDArray[np.float64]

JITTER_ANGSTROM = 0.08
"""Every start is shaken by this much (standard deviation per coordinate): a drawing embedded with its symmetry sits
on saddles (linear HCO, linear vinyl) where a relaxation would stop."""
SAME_ANGSTROM = 0.03
"""Structures are the same if no interatomic distance differs by more."""
SAME_Eh = 1e-4
EMBEDDED_PER_TORSION = 4
MOST_STARTS = 8


def starts(drawing: Drawing, seed: int = 0) -> list[Floats]:
    """Distinct starting structures in angstrom, shape (atoms, 3) each, lowest force-field energy first.

    RDKit's distance geometry (S. Riniker, G. A. Landrum, J. Chem. Inf. Model. 55, 2562 (2015)), then MMFF94 or UFF
    where these have the atoms, then a random shake. The first structure appears twice, shaken differently: both must
    end in the same minimum or the lower one counts. Raises StructureError if nothing can be embedded.
    """
    atoms = len(drawing.elements)
    if atoms == 1:
        return [np.zeros((1, 3))]
    random = np.random.default_rng(seed)
    found = _embedded(drawing, seed)
    kept: list[Floats] = []
    for _, coordinates in sorted(found, key=lambda pair: pair[0]):
        if not any(same_shape(drawing.elements, coordinates, other) for other in kept):
            kept.append(coordinates)
    chosen = [kept[0], *kept][:MOST_STARTS]
    if atoms == 2:
        return [kept[0]]
    return [coordinates + random.normal(0.0, JITTER_ANGSTROM, (atoms, 3)) for coordinates in chosen]


def _embedded(drawing: Drawing, seed: int) -> list[tuple[float, Floats]]:
    """(force-field energy, coordinates) of everything that RDKit embeds."""
    from rdkit.Chem import rdDistGeom, rdMolDescriptors

    mol = drawing.mol
    flexible = rdMolDescriptors.CalcNumRotatableBonds(mol) + _flexible_rings(mol) + _turning_ends(drawing)
    count = 1 if flexible == 0 else min(EMBEDDED_PER_TORSION * flexible + 2, 30)
    with rdkit_messages() as messages:
        places = list(rdDistGeom.EmbedMultipleConfs(mol, count, randomSeed=seed + 1))
        if not places:
            places = list(
                rdDistGeom.EmbedMultipleConfs(mol, count, randomSeed=seed + 1, useRandomCoords=True)
            )
        if not places:
            reason = messages[0] if messages else "no three-dimensional structure fits it"
            raise StructureError(f'smiles "{drawing.smiles}": {reason}; give a structure file instead')
        energies = _ordered(mol, places)
    return [
        (energy, np.array(mol.GetConformer(place).GetPositions()))
        for energy, place in zip(energies, places, strict=True)
    ]


def _ordered(mol: Any, places: list[int]) -> list[float]:
    """Force-field energies after relaxation by it; zeros where no force field knows the atoms."""
    from rdkit.Chem import rdForceFieldHelpers as fields

    if fields.MMFFHasAllMoleculeParams(mol):
        return [energy for _, energy in fields.MMFFOptimizeMoleculeConfs(mol, maxIters=500)]
    if fields.UFFHasAllMoleculeParams(mol):
        return [energy for _, energy in fields.UFFOptimizeMoleculeConfs(mol, maxIters=500)]
    return [0.0] * len(places)


def _flexible_rings(mol: Any) -> int:
    """Rings of five and more atoms with something to pucker."""
    rings = mol.GetRingInfo().AtomRings()
    return sum(
        len(ring) >= 5 and sum(mol.GetAtomWithIdx(i).GetTotalNumHs(True) >= 2 for i in ring) >= 2
        for ring in rings
    )


def _turning_ends(drawing: Drawing) -> int:
    """Bonds to OH, NH2, CH2 ends, which RDKit's count of rotatable bonds leaves out."""
    heavy = [element != "H" for element in drawing.elements]
    degree = [0] * len(heavy)
    hydrogens = [0] * len(heavy)
    for first, second, _ in drawing.bonds:
        for one, other in ((first, second), (second, first)):
            degree[one] += heavy[other]
            hydrogens[one] += not heavy[other]
    return sum(
        order == 1.0
        and heavy[first]
        and heavy[second]
        and min(degree[first], degree[second]) == 1
        and 1 <= hydrogens[first if degree[first] == 1 else second] <= 2
        and hydrogens[first] + hydrogens[second] > 2
        for first, second, order in drawing.bonds
    )


STIFF = 0.94
"""A bond shorter than this multiple of the sum of the covalent radii (for single bonds) is not turned by heat."""


def alike_atoms(drawing: Drawing, molecule: Molecule) -> tuple[int, ...]:
    """Per atom a number; atoms that turning and inverting can exchange have the same one.

    The classes of the drawing, except that two ligands at the end of a stiff bond (the =CH2 of vinyl or allyl) are
    told apart, and that beside a centre of handedness nothing is taken as alike: the two protons of a CH2 are
    then different in every conformer, and no turning exchanges them.
    """
    if drawing.stereocentres:
        return tuple(range(len(molecule.elements)))
    alike = list(drawing.classes)
    elements = molecule.elements
    bonded = neighbours(elements, molecule.coordinates_angstrom)
    distances = distance_matrix(molecule.coordinates_angstrom)
    for centre, around in enumerate(bonded):
        if len(around) != 3:
            continue
        ends = [i for i in around if len(bonded[i]) == 1 and [alike[j] for j in around].count(alike[i]) == 2]
        inner = [atom for atom in around if atom not in ends]
        if len(inner) != 1:
            continue
        single = COVALENT_RADIUS_ANGSTROM[elements[centre]] + COVALENT_RADIUS_ANGSTROM[elements[inner[0]]]
        if distances[centre, inner[0]] < STIFF * single:
            for atom in ends:
                alike[atom] = len(elements) + atom
    return tuple(alike)


def same_shape(
    elements: Sequence[str], first_angstrom: Floats, second_angstrom: Floats, tolerance: float = SAME_ANGSTROM
) -> bool:
    """True if the two structures (atoms, 3) differ by rotation, reflection and the order of equal atoms only.

    Compares the sorted distances between every pair of elements.
    """
    return all(
        abs(one - other).max(initial=0.0) <= tolerance
        for one, other in zip(
            _fingerprint(elements, first_angstrom), _fingerprint(elements, second_angstrom), strict=True
        )
    )


def _fingerprint(elements: Sequence[str], coordinates: Floats) -> list[Floats]:
    kinds = np.array(elements)
    upper = np.triu(np.ones((len(kinds), len(kinds)), dtype=bool), 1)
    distances = distance_matrix(np.asarray(coordinates))
    pairs = []
    for one, other in combinations_with_replacement(sorted(set(elements)), 2):
        either = (kinds[:, None] == one) & (kinds[None, :] == other)
        pairs.append(np.sort(distances[upper & (either | either.T)]))
    return pairs
