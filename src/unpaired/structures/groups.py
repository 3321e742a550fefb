"""Groups of equivalent nuclei: by symmetry, by freely turning XH3 and XF3, by what the user knows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from ..errors import StructureError
from ..molecule import Molecule
from .distances import neighbours
from .symmetry import MAX_ANGSTROM, RMS_ANGSTROM, equivalence

Origin = Literal["single", "symmetry", "rotor", "user"]

TURNING = 2.0
"""Tolerances of symmetry are this much wider when XH3 and XF3 are taken as turning: the frozen position
of a methyl group distorts the frame that it is bonded to."""


@dataclass(frozen=True)
class Group:
    """Nuclei of one isotope that a spectrum does not tell apart."""

    label: str
    """The label of its first nucleus."""
    members: tuple[int, ...]
    """0-based atoms, ascending."""
    isotope: str
    origin: Origin
    """The strongest assumption that made it: symmetry of the frozen structure, a turning rotor, the user."""
    sites: tuple[int, ...]
    """Places that every member visits: more than `members` where isotopes are mixed (CH2D)."""


def find_groups(
    molecule: Molecule, isotopes: Sequence[str | None], extra: Sequence[Sequence[str]] = ()
) -> tuple[Group, ...]:
    """Groups of equivalent nuclei, sorted by their first atom.

    `isotopes` has one entry per atom; None leaves the atom out. `extra` holds sets of atom labels that the
    user knows to be averaged; where they overlap with other sets, these are united. Raises StructureError for
    a label that does not exist and for a set that mixes elements.
    """
    elements, coordinates = molecule.elements, molecule.coordinates_angstrom
    frozen = equivalence(elements, coordinates)
    rotors = freely_turning(molecule)
    turning = united([*frozen, *_turning_sets(molecule, rotors)]) if rotors else frozen
    final = united([*turning, *(_atoms_of(labels, molecule) for labels in extra)])
    groups = []
    for sites in final:
        origin: Origin = "user"
        if sites in frozen:
            origin = "symmetry"
        elif sites in turning:
            origin = "rotor"
        by_isotope: dict[str, list[int]] = {}
        for atom in sites:
            isotope = isotopes[atom]
            if isotope is not None:
                by_isotope.setdefault(isotope, []).append(atom)
        for isotope, members in by_isotope.items():
            groups.append(
                Group(
                    label=molecule.labels[members[0]],
                    members=tuple(members),
                    isotope=isotope,
                    origin=origin if len(members) > 1 else "single",
                    sites=sites,
                )
            )
    return tuple(sorted(groups, key=lambda group: group.members))


def freely_turning(molecule: Molecule) -> list[tuple[int, int, tuple[int, int, int]]]:
    """Terminal XH3 and XF3 groups as (X, the one heavy atom that it is bonded to, the three ligands).

    A centre with nothing else (CH3, CF3) does not turn against anything and is left to symmetry.
    """
    bonded = neighbours(molecule.elements, molecule.coordinates_angstrom)
    found = []
    for centre, around in enumerate(bonded):
        for ligand in ("H", "F"):
            ligands = [i for i in around if molecule.elements[i] == ligand and len(bonded[i]) == 1]
            others = [atom for atom in around if atom not in ligands]
            if len(ligands) == 3 and len(others) == 1 and molecule.elements[others[0]] != "H":
                first, second, third = ligands
                found.append((centre, others[0], (first, second, third)))
    return found


def _turning_sets(
    molecule: Molecule, rotors: list[tuple[int, int, tuple[int, int, int]]]
) -> list[tuple[int, ...]]:
    """Equivalent sets when every rotor's three ligands are smeared into one point on its axis."""
    coordinates = molecule.coordinates_angstrom
    kinds: list[str] = list(molecule.elements)
    dropped: set[int] = set()
    points = np.array(coordinates)
    stands_for: dict[int, tuple[int, ...]] = {}
    for centre, partner, ligands in rotors:
        axis = coordinates[centre] - coordinates[partner]
        axis = axis / np.linalg.norm(axis)
        reach = float(np.mean([(coordinates[atom] - coordinates[centre]) @ axis for atom in ligands]))
        points[ligands[0]] = coordinates[centre] + reach * axis
        kinds[ligands[0]] = f"{molecule.elements[ligands[0]]}3"
        dropped.update(ligands[1:])
        stands_for[ligands[0]] = ligands
    kept = [atom for atom in range(len(kinds)) if atom not in dropped]
    sets = equivalence(
        [kinds[atom] for atom in kept], points[kept], TURNING * RMS_ANGSTROM, TURNING * MAX_ANGSTROM
    )
    return [
        tuple(sorted(real for place in members for real in stands_for.get(kept[place], (kept[place],))))
        for members in sets
    ]


def _atoms_of(labels: Sequence[str], molecule: Molecule) -> tuple[int, ...]:
    atoms = []
    for label in labels:
        if label not in molecule.labels:
            known = f"{molecule.labels[0]} to {molecule.labels[-1]}"
            raise StructureError(f'groups: atom "{label}" is not in the structure ({known})')
        atoms.append(molecule.labels.index(label))
    if len({molecule.elements[atom] for atom in atoms}) > 1:
        raise StructureError(f"groups: [{', '.join(labels)}] mixes elements; one group holds one element")
    return tuple(sorted(set(atoms)))


def united(sets: Sequence[tuple[int, ...]]) -> list[tuple[int, ...]]:
    """The sets, those with common atoms united, each ascending, sorted by their first atom."""
    united: list[set[int]] = []
    for members in sets:
        joined = set(members)
        apart = []
        for other in united:
            if joined & other:
                joined |= other
            else:
                apart.append(other)
        united = [*apart, joined]
    return sorted(tuple(sorted(members)) for members in united)
