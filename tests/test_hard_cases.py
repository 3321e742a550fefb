"""Open shells on which self-consistent fields go wrong: every start ends in the lowest known solution.

Expected energies: tests/hard_cases/lowest.csv, found by tests/hard_cases/exhaustive.py with plain PySCF alone.
"""

from __future__ import annotations

import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent / "hard_cases"))

from cases import STARTS, cases

CASES = {case.title: case for case in cases()}
QUICK = ("N UHF/pcseg-1",)
LARGE_ATOMS = 10
"""Molecules from this size are tried from two starts here; tests/hard_cases/table.py tries them from four."""


def _marks(title: str) -> list[pytest.MarkDecorator]:
    return [] if title in QUICK else [pytest.mark.slow]


@pytest.mark.parametrize("title", [pytest.param(title, marks=_marks(title)) for title in CASES])
def test_every_start_ends_in_the_lowest_known_solution(title: str) -> None:
    case = CASES[title]
    large = len(case.point.molecule.elements) >= LARGE_ATOMS
    for start in STARTS[:2] if large else STARTS:
        state = case.solve(start)
        assert state.stable is True, start
        assert state.energy_Eh == min(one.energy_Eh for one in state.solutions if one.stable), start
        assert state.energy_Eh <= case.expected_Eh + case.tolerance_Eh, start
