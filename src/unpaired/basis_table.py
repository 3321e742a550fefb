"""Make the table of basis-set errors at the nucleus again: `python -m unpaired.basis_table [FILE]`.

Takes about a quarter of an hour on one free core.
"""

from __future__ import annotations

import sys
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from .basis_errors import COLUMNS, FILE
from .constants import BOHR_ANGSTROM
from .errors import CalculationError
from .level import Level
from .molecule import Molecule
from .point import Point

LIMIT_BASIS = "pcH-4"
FITTED = ("pcH-3", LIMIT_BASIS)
"""Sets whose exact integrals for a molecule do not fit into a laptop's memory; fitting costs below 0.01 mT."""
BASES = (
    "STO-3G",
    "6-31G",
    "6-31G*",
    "6-31G**",
    "6-311G**",
    "6-311++G(2d,p)",
    "def2-SVP",
    "def2-TZVP",
    "cc-pVDZ",
    "cc-pVTZ",
    "aug-cc-pVDZ",
    "aug-cc-pVTZ",
    "pcseg-1",
    "pcseg-2",
    "pcH-1",
    "pcH-2",
    "pcH-3",
    "IGLO-II",
    "IGLO-III",
    "aug-cc-pVTZ-J",
    "pcJ-1",
    "pcJ-2",
)


@dataclass(frozen=True)
class System:
    """One test system: a nucleus of each element in it is compared."""

    words: str
    molecule: Molecule
    scf: str
    functional: str | None
    nuclei: dict[str, int]
    """0-based atom by element."""

    def level(self, basis: str) -> Level:
        """Exact integrals and a fine grid where that fits into memory."""
        accuracy = "standard" if basis in FITTED and len(self.molecule.elements) > 1 else "reference"
        return Level(self.scf, basis, self.functional, accuracy)


def systems() -> tuple[System, ...]:
    """H and N atoms (UHF), planar CH3 and H2CN (UKS-B3LYP) at fixed geometries."""
    around = np.deg2rad([0.0, 120.0, 240.0])
    methyl = np.vstack([np.zeros(3), 1.079 * np.c_[np.cos(around), np.sin(around), np.zeros(3)]])
    # R(CN) 1.247, R(CH) 1.111 angstrom, HCH 116.7 degrees: near the minimum, and fixed from here on.
    half = np.deg2rad(116.7 / 2)
    hydrogens = 1.111 * np.array([[-np.cos(half), np.sin(half), 0], [-np.cos(half), -np.sin(half), 0]])
    methylene_imine = np.vstack([np.array([[0, 0, 0], [1.247, 0, 0]]), hydrogens])

    def molecule(
        elements: str, angstrom: np.ndarray[tuple[int, ...], np.dtype[np.float64]], spins: int
    ) -> Molecule:
        return Molecule(tuple(elements), angstrom / BOHR_ANGSTROM, 0, spins)

    return (
        System("the H atom", molecule("H", np.zeros((1, 3)), 2), "UHF", None, {"H": 0}),
        System("the N atom", molecule("N", np.zeros((1, 3)), 4), "UHF", None, {"N": 0}),
        System("planar CH3", molecule("CHHH", methyl, 2), "UKS", "B3LYP", {"C": 0, "H": 1}),
        System("H2CN", molecule("CNHH", methylene_imine, 2), "UKS", "B3LYP", {"C": 0, "N": 1, "H": 2}),
    )


def measure(bases: Sequence[str]) -> Iterator[dict[str, str | float]]:
    """Rows of the table for some basis sets; a basis set that lacks an element or fails is left out."""
    from .electronic.solve import solve
    from .properties.contact import spin_density_at_nuclei

    def densities(system: System, basis: str) -> dict[str, float]:
        state = solve(Point(system.molecule, system.level(basis)))
        found = spin_density_at_nuclei(state.solution.spin_density_matrix, state.ao_at_nuclei)
        return {element: float(found[atom]) for element, atom in system.nuclei.items()}

    for system in systems():
        limit = densities(system, LIMIT_BASIS)
        for basis in bases:
            try:
                found = densities(system, basis)
            except CalculationError as error:
                print(f"{basis}, {system.words}: left out, {error}", file=sys.stderr)
                continue
            for element, value in found.items():
                error_percent = round(100 * (value / limit[element] - 1), 1)
                row = (basis, system.words, element, system.level(basis).method, error_percent)
                yield dict(zip(COLUMNS, row, strict=True))


def main(path: Path) -> None:
    """Make the table again."""
    from .files import write_atomically
    from .tables import as_csv

    rows = []
    for row in measure(BASES):
        rows.append(row)
        print(
            f"{row['basis']:16s} {row['system']:12s} {row['nucleus']:2s} {row['error_percent']:8.1f} %",
            flush=True,
        )
    rows.sort(key=lambda row: BASES.index(str(row["basis"])))
    write_atomically(path, as_csv(rows, COLUMNS))


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent / "data" / FILE)
