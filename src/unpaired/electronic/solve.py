"""solve: Point -> State. The expensive step."""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Any

import numpy as np

from ..errors import ConvergenceError
from ..point import Point
from ..state import Plain, Solution, State
from .boundary import library_errors
from .meanfield import mean_field
from .mole import build_mole
from .search import Outcome, search
from .settings import settings
from .solutions import Found
from .threads import suited_to

Report = Callable[[str, int, float], None]
"""Called with (stage, iteration, energy_Eh) while a calculation runs."""


def solve(point: Point, report: Report | None = None, start: str = "atomic superposition") -> State:
    """Find the electronic state of a point and return every solution met as plain arrays, lowest first.

    `start` is the first density tried (a name of `guess.DENSITIES`); what is found should not depend on it.
    Raises CalculationError (ConvergenceError, ResourceError, EngineError) with the reason.
    """
    with library_errors(point.level.id):
        mole = build_mole(point)
        with suited_to(mole.nao):
            return _solve(point, mole, report, start)


def _solve(point: Point, mole: Any, report: Report | None, start: str) -> State:
    started = time.perf_counter()
    field = mean_field(mole, point.level, point.solvent, settings(point.level))
    iterations = 0

    def watch(local: dict[str, Any]) -> None:
        nonlocal iterations
        iterations += 1
        if report is not None:
            report("scf", iterations, float(local["e_tot"]))

    def watch_search(local: dict[str, Any]) -> None:
        if report is not None:
            report("search", 0, float(local["e_tot"]))

    field.callback = watch
    outcome = search(point, field, start, watch_search)
    taken = _asked_for(outcome.found, point.level.solution)
    return State(
        solutions=tuple(_as_solution(found) for found in outcome.found),
        taken=taken,
        overlap=np.asarray(field.get_ovlp()),
        ao_at_nuclei=mole.eval_gto("GTOval", mole.atom_coords()),
        iterations=iterations,
        wall_s=time.perf_counter() - started,
        story=outcome.story,
        engine=_engine(outcome, outcome.found[taken]),
    )


def _asked_for(found: tuple[Found, ...], wanted: int | str | None) -> int:
    """Index of the solution that the level asks for; the lowest that is not known to be unstable by default."""
    if wanted is None:
        return next((k for k, one in enumerate(found) if one.stable is not False), 0)
    if isinstance(wanted, int) and wanted <= len(found):
        return wanted - 1
    for k, one in enumerate(found):
        if isinstance(wanted, str) and one.label.casefold() == wanted.strip().casefold():
            return k
    there = "; ".join(f"{k}: {one.label}, {one.energy_Eh:.6f} Eh" for k, one in enumerate(found, start=1))
    raise ConvergenceError(f"the solution asked for ({wanted}) was not found; there are {there}")


def _engine(outcome: Outcome, taken: Found) -> dict[str, Plain]:
    return {
        "point_group": outcome.point_group,
        "degenerate": taken.degenerate,
        "symmetry_broken": taken.broken,
        "lowest_curvature_Eh": taken.verdict.lowest_Eh,
        "stability_note": taken.verdict.note,
        "suspicions": ", ".join(outcome.suspicions),
        "starts": outcome.starts,
    }


def _as_solution(found: Found) -> Solution:
    """Plain arrays; restricted-open orbitals are written twice."""
    orbitals, occupations = found.both_spins()
    energies = found.orbital_energies
    return Solution(
        energy_Eh=found.energy_Eh,
        s_squared=found.s_squared,
        stable=found.stable,
        label=found.label,
        origin=found.origin,
        orbitals=orbitals,
        occupations=occupations,
        orbital_energies_Eh=energies if energies.ndim == 2 else np.stack([energies, energies]),
    )
