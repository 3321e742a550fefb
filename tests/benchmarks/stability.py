"""What the search for the right state costs beside the self-consistent field itself, in CPU seconds.

    python tests/benchmarks/stability.py [STRUCTURE.xyz] [SCF] [BASIS] [FUNCTIONAL]

Default: benzyl, UKS-B3LYP/pcH-1. "alone" is the field converged from a superposition of atoms with no test and no search;
"solve" is all that `solve` does: scout, search, stability, field.
"""

from __future__ import annotations

import sys
import time
from pathlib import Path

from unpaired.electronic import search, solutions
from unpaired.electronic.converge import converge
from unpaired.electronic.guess import density_from_nuclei
from unpaired.electronic.meanfield import mean_field
from unpaired.electronic.mole import build_mole
from unpaired.electronic.settings import settings
from unpaired.electronic.solve import solve
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point
from unpaired.structures.xyz import read_xyz

BENZYL = Path(__file__).parents[2] / "molecules" / "benzyl.xyz"


def main() -> None:
    words = [*sys.argv[1:], *([None] * 4)]
    geometry = read_xyz(Path(words[0] or BENZYL))
    scf = words[1] or "UKS"
    level = Level(scf, words[2] or "pcH-1", (words[3] or "B3LYP") if scf in ("UKS", "ROKS") else None)
    point = Point(Molecule(geometry.elements, geometry.coordinates_bohr, 0, 2), level)

    begun = time.process_time()
    field = mean_field(build_mole(point), level, None, settings(level))
    converge(field, density_from_nuclei(field, "atomic superposition"))
    alone = time.process_time() - begun
    print(f"{level.id}, {field.mol.nao} functions: field alone {alone:.1f} s", flush=True)
    from unpaired.electronic import fitting

    fitting.release()
    tested = 0.0
    original = solutions.internal_stability

    def timed(of):
        nonlocal tested
        begun = time.process_time()
        answer = original(of)
        tested += time.process_time() - begun
        return answer

    solutions.internal_stability = timed
    carried = search._carry

    def marked(*arguments, **options):
        nonlocal scouted
        scouted = scouted or time.process_time() - begun
        return carried(*arguments, **options)

    scouted = 0.0
    search._carry = marked
    begun = time.process_time()
    state = solve(point)
    total = time.process_time() - begun
    print(f"solve {total:.1f} s, of it scout {scouted:.1f} s, of it stability tests {tested:.1f} s")
    print(f"added by search and stability: {100 * (total - alone) / alone:+.0f} % of the field alone")
    print(state.solution.label, state.stable, state.engine, *state.story, sep="\n  ")


if __name__ == "__main__":
    main()
