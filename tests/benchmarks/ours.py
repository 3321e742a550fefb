"""One process of ours for the race: solves the levels given and prints what it found as one line of JSON.

python tests/benchmarks/ours.py molecules/benzyl.xyz UKS/pcH-1/B3LYP [UHF/pcH-1 UKS/pcH-1/B3LYP/quick UHF/pcH-1//quick ...]
"""

import json
import sys
import time
from typing import Any

from unpaired.electronic import stability

spent_s = 0.0
tested = stability.internal_stability


def timed(*arguments: Any, **options: Any) -> Any:
    """The stability test, with its time added up; put in place before anything else imports it."""
    global spent_s
    started = time.perf_counter()
    try:
        return tested(*arguments, **options)
    finally:
        spent_s += time.perf_counter() - started


stability.internal_stability = timed

from unpaired.electronic.solve import solve  # noqa: E402
from unpaired.level import Level  # noqa: E402
from unpaired.molecule import Molecule  # noqa: E402
from unpaired.point import Point  # noqa: E402
from unpaired.properties.contact import spin_density_at_nuclei  # noqa: E402
from unpaired.structures.file import read_structure  # noqa: E402

path, *levels = sys.argv[1:]
geometry = read_structure(path)
molecule = Molecule(geometry.elements, geometry.coordinates_bohr, 0, 2)
answers = []
for text in levels:
    scf, basis, functional, accuracy = [*text.split("/"), "", ""][:4]
    state = solve(Point(molecule, Level(scf, basis, functional or None, accuracy=accuracy or "standard")))
    answers.append(
        {
            "level": text,
            "functions": state.basis_functions,
            "energy_Eh": state.energy_Eh,
            "stable": state.stable,
            "iterations": state.iterations,
            "wall_s": state.wall_s,
            "spin_density_au": spin_density_at_nuclei(
                state.solution.spin_density_matrix, state.ao_at_nuclei
            ).tolist(),
        }
    )
print(json.dumps({"stability_s": spent_s, "levels": answers}))
