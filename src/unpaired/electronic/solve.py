"""solve: Point -> State. The expensive step."""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Any

import numpy as np

from ..errors import ConvergenceError
from ..point import Point
from ..state import Solution, State
from .boundary import library_errors
from .converge import converge
from .meanfield import mean_field
from .mole import build_mole
from .settings import settings
from .start import initial_density

Report = Callable[[str, int, float], None]
"""Called with (stage, iteration, energy_Eh) while a calculation runs."""


def solve(point: Point, report: Report | None = None) -> State:
    """Converge the level of a point and return its state as plain arrays.

    Raises CalculationError (ConvergenceError, ResourceError, EngineError) with the reason.
    """
    with library_errors(f"{point.level.id}"):
        return _solve(point, report)


def _solve(point: Point, report: Report | None) -> State:
    started = time.perf_counter()
    mole = build_mole(point)
    setting = settings(point.level)
    field = mean_field(mole, point.level, point.solvent, setting)
    field.chkfile = None
    iterations = 0

    def watch(local: dict[str, Any]) -> None:
        nonlocal iterations
        iterations += 1
        if report is not None:
            report("scf", iterations, float(local["e_tot"]))

    field.callback = watch
    used = converge(field, initial_density(point, mole, setting))
    if not field.converged:
        raise ConvergenceError(
            f"not converged after {iterations} iterations of {', then '.join(used)}; "
            "check structure, charge and multiplicity, or try another level"
        )
    story = () if len(used) == 1 else (f"converged by {', then '.join(used)}",)
    return State(
        solutions=(as_solution(field, origin="atomic superposition"),),
        taken=0,
        overlap=field.get_ovlp(),
        ao_at_nuclei=mole.eval_gto("GTOval", mole.atom_coords()),
        iterations=iterations,
        wall_s=time.perf_counter() - started,
        story=story,
    )


def as_solution(field: Any, origin: str, stable: bool | None = None, label: str = "") -> Solution:
    """Plain arrays of a converged mean-field object; restricted-open orbitals are written twice."""
    orbitals = np.asarray(field.mo_coeff)
    energies = np.asarray(field.mo_energy)
    occupations = np.asarray(field.mo_occ)
    if orbitals.ndim == 2:
        orbitals = np.stack([orbitals, orbitals])
        occupations = np.stack([occupations > 0, occupations > 1]).astype(float)
        energies = np.stack([energies, energies])
    return Solution(
        energy_Eh=float(field.e_tot),
        s_squared=float(field.spin_square()[0]),
        stable=stable,
        label=label,
        origin=origin,
        orbitals=orbitals,
        occupations=occupations,
        orbital_energies_Eh=energies,
    )
