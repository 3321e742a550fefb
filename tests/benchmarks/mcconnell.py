"""McConnell's relation over finished runs: a(H) of a C-H proton against the pi spin population of its carbon.

    python tests/benchmarks/mcconnell.py RESULT...

Prints every C-H of the planar radicals among the results and, per method, Q of a = Q rho fitted through the
origin. Common practice: Q is about -2.3 mT.
"""

from __future__ import annotations

import sys
from collections import defaultdict

import numpy as np

from unpaired.constants import BOHR_ANGSTROM
from unpaired.result import Result, load_result

BOND_ANGSTROM = 1.25


def bonded_carbon(result: Result, hydrogen: int) -> int | None:
    """The carbon that a hydrogen is bonded to."""
    positions = result.molecule.coordinates_bohr * BOHR_ANGSTROM
    away = np.linalg.norm(positions - positions[hydrogen], axis=1)
    away[hydrogen] = np.inf
    nearest = int(away.argmin())
    near_carbon = result.molecule.elements[nearest] == "C" and away[nearest] < BOND_ANGSTROM
    return nearest if near_carbon else None


def main(folders: list[str]) -> None:
    """Collect, print, fit."""
    points: dict[str, list[tuple[float, float]]] = defaultdict(list)
    for folder in folders:
        result = load_result(folder)
        for level in result.level_ids:
            population = {row["atom"]: row["pi_spin_population"] for row in result.rows("populations", level)}
            for place, row in enumerate(result.rows("couplings", level)):
                if row["isotope"] != "1H" or row["scf"] not in ("UHF", "UKS"):
                    continue
                carbon = bonded_carbon(result, place)
                if carbon is None:
                    continue
                spin = population.get(result.molecule.labels[carbon])
                if spin is None:
                    continue
                points[level].append((spin, row["a_iso_mT"]))
                print(
                    f"{result.radical:16s} {level:18s} {row['atom']:4s} rho {spin:+.3f}  a {row['a_iso_mT']:+.3f} mT"
                )
    for level, pairs in points.items():
        spin, coupling = np.array(pairs).T
        factor = spin @ coupling / (spin @ spin)
        rest = np.sqrt(np.mean((coupling - factor * spin) ** 2))
        print(
            f"{level}: Q = {factor:.2f} mT over {len(pairs)} C-H protons, root mean square deviation {rest:.2f} mT"
        )


if __name__ == "__main__":
    main(sys.argv[1:])
