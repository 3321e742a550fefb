"""The hard cases as points of the tool, and the files that say what is expected of them."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from pathlib import Path

from unpaired.electronic.guess import DENSITIES
from unpaired.electronic.solve import solve
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point
from unpaired.state import State
from unpaired.structures.xyz import read_xyz

HERE = Path(__file__).parent
STARTS = tuple(DENSITIES)


@dataclass(frozen=True)
class Case:
    """One molecule at one level, with what plain PySCF gives and what the exhaustive search found."""

    name: str
    point: Point
    plain: dict[str, str]
    lowest: dict[str, str]

    @property
    def title(self) -> str:
        return f"{self.name} {self.point.level.id}"

    @property
    def expected_Eh(self) -> float:
        return float(self.lowest["energy_Eh"])

    @property
    def tolerance_Eh(self) -> float:
        """1e-6 Eh with exact integrals; on a grid 2e-5, because the tool turns its grids and PySCF does not."""
        return 2e-5 if self.point.level.is_kohn_sham else 1e-6

    def solve(self, start: str) -> State:
        return solve(self.point, start=start)

    def is_lowest(self, state: State) -> bool:
        """Taken: stable, and no higher than the exhaustive search's lowest."""
        return state.stable is True and state.energy_Eh < self.expected_Eh + self.tolerance_Eh

    @property
    def plain_verdict(self) -> str:
        """`right`, or what is wrong with PySCF's defaults."""
        if self.plain["converged"] != "True":
            return "not converged"
        above = float(self.plain["energy_Eh"]) - self.expected_Eh
        wrong = [f"{1000 * above:.2f} mEh too high"] if above > self.tolerance_Eh else []
        wrong += ["unstable"] if self.plain["stable"] != "True" else []
        return ", ".join(wrong) or "right"


def cases() -> list[Case]:
    """Every row of cases.csv with exact integrals (accuracy reference)."""
    plain, lowest = (_by_key(_rows(name)) for name in ("plain.csv", "lowest.csv"))
    found = []
    for row in _rows("cases.csv"):
        geometry = read_xyz(HERE / f"{row['case']}.xyz")
        molecule = Molecule(
            geometry.elements, geometry.coordinates_bohr, int(row["charge"]), int(row["multiplicity"])
        )
        level = Level(row["scf"], row["basis"], row["functional"] or None, accuracy="reference")
        if _key(row) in lowest:
            found.append(Case(row["case"], Point(molecule, level), plain[_key(row)], lowest[_key(row)]))
    return found


def _rows(name: str) -> list[dict[str, str]]:
    with (HERE / name).open(newline="") as file:
        return list(csv.DictReader(file))


def _key(row: dict[str, str]) -> tuple[str, ...]:
    return row["case"], row["scf"], row["functional"], row["basis"]


def _by_key(rows: list[dict[str, str]]) -> dict[tuple[str, ...], dict[str, str]]:
    return {_key(row): row for row in rows}
