"""What the analysis of a finished state costs: projection, parts, pairs, dipolar tensors, populations.

    python tests/benchmarks/analysis_share.py

prints processor time for benzyl at pcH-1 beside that of its self-consistent field; the aim is below 2 %.
"""

from __future__ import annotations

import time
from pathlib import Path

from unpaired.electronic.solve import solve
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.nuclei import table_isotope
from unpaired.origin import spin_origin
from unpaired.point import Point
from unpaired.structures.file import read_structure
from unpaired.structures.groups import find_groups

ROOT = Path(__file__).parents[2]


def main() -> None:
    """One line per level."""
    geometry = read_structure(ROOT / "molecules" / "benzyl.xyz")
    molecule = Molecule(geometry.elements, geometry.coordinates_bohr, 0, 2)
    isotopes = [
        isotope.name if (isotope := table_isotope(element)) else None for element in molecule.elements
    ]
    groups = find_groups(molecule, isotopes)
    for level in (Level("UKS", "pcH-1", "B3LYP"), Level("UHF", "pcH-1")):
        point = Point(molecule, level)
        started = time.process_time()
        state = solve(point)
        solved = time.process_time()
        spin_origin(point, state, groups, isotopes)
        done = time.process_time()
        share = (done - solved) / (solved - started)
        print(
            f"{level.id}: SCF {solved - started:.1f} s, analysis {done - solved:.2f} s, {share:.1%}",
            flush=True,
        )


if __name__ == "__main__":
    main()
