"""From a starting density to a stationary state: a ladder of schemes that ends in an answer or says no."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

Watch = Callable[[dict[str, Any]], None]
"""PySCF's callback: gets the local variables of an iteration."""

FIRST_CYCLES = 60
SHIFT_Eh = 0.4
DAMPING = 0.4
STALLED_CYCLES = 10
STALLED_GAIN = 0.5
"""Extrapolation is given up when its best gradient of so many iterations is not below this share of the best before:
occupations then jump to and fro, and second order, which keeps them, is quicker."""


class Stalled(Exception):
    """Extrapolation does not get on."""


@dataclass(frozen=True)
class Rung:
    """One scheme of the ladder."""

    name: str
    run: Callable[[Any, Any], None]


def second_order_is_sound(field: Any) -> bool:
    """False for restricted-open methods in a continuum: PySCF sums the spins wrongly in their response."""
    from pyscf import scf

    return not (isinstance(field, scf.rohf.ROHF) and getattr(field, "with_solvent", None) is not None)


def converge(field: Any, density: Any) -> tuple[str, ...]:
    """Run the ladder on a mean-field object from a starting density; returns the names of the rungs used.

    On return `field.converged` tells the truth: the last rung's energy and gradient both met the thresholds.
    A rung that raises is a rung that failed; MemoryError ends the ladder.
    """
    used: list[str] = []
    for rung in _ladder(field):
        used.append(rung.name)
        field.converged = False
        try:
            rung.run(field, density)
        except (np.linalg.LinAlgError, FloatingPointError, ValueError):
            field.converged = False
        if field.converged and np.isfinite(field.e_tot):
            return tuple(used)
    field.converged = False
    return tuple(used)


def second_order(field: Any, orbitals: Any, occupations: Any, cycles: int = 25) -> None:
    """Second-order descent from given orbitals and occupations, which stay what they are; fills `field`.

    Where the second-order response is not sound the descent is first order with a level shift.
    """
    if not second_order_is_sound(field):
        _shifted(field, field.make_rdm1(orbitals, occupations))
        return
    from .fitting import responding

    newton = field.newton()
    newton.max_cycle = cycles
    newton.callback = field.callback
    with responding(field):
        newton.kernel(orbitals, occupations)
    field.mo_coeff, field.mo_occ, field.mo_energy = newton.mo_coeff, newton.mo_occ, newton.mo_energy
    field.e_tot, field.converged = newton.e_tot, newton.converged
    if field.converged and hasattr(field, "with_df"):
        field.make_whole()


def _ladder(field: Any) -> tuple[Rung, ...]:
    return (
        Rung("extrapolation (DIIS)", _diis),
        Rung("second order", _from_last),
        Rung("level shift", _shifted),
        Rung("energy-weighted extrapolation (ADIIS), then second order", _adiis),
    )


class _Progress:
    """Watches an extrapolation, remembers its lowest iterate and raises Stalled where it does not get on."""

    def __init__(self, outer: Watch | None) -> None:
        self.outer = outer
        self.gradients: list[float] = []
        self.lowest_Eh = np.inf
        self.orbitals: Any = None
        self.occupations: Any = None

    def __call__(self, local: dict[str, Any]) -> None:
        if self.outer is not None:
            self.outer(local)
        energy = float(local["e_tot"])
        if energy < self.lowest_Eh:
            self.lowest_Eh = energy
            self.orbitals, self.occupations = np.array(local["mo_coeff"]), np.array(local["mo_occ"])
        self.gradients.append(float(local["norm_gorb"]))
        before, lately = self.gradients[:-STALLED_CYCLES], self.gradients[-STALLED_CYCLES:]
        if len(before) >= STALLED_CYCLES // 2 and min(lately) > STALLED_GAIN * min(before):
            raise Stalled


def _diis(field: Any, density: Any) -> None:
    limit, outer = field.max_cycle, field.callback
    progress = _Progress(outer)
    field.max_cycle, field.callback = min(limit, FIRST_CYCLES), progress
    try:
        field.kernel(dm0=density)
    except Stalled:
        field.converged = False
    finally:
        field.max_cycle, field.callback = limit, outer
    if not field.converged and progress.orbitals is not None:
        field.mo_coeff, field.mo_occ = progress.orbitals, progress.occupations


def _from_last(field: Any, density: Any) -> None:
    if field.mo_coeff is None:
        limit, field.max_cycle = field.max_cycle, 1
        try:
            field.kernel(dm0=density)
        finally:
            field.max_cycle = limit
    second_order(field, field.mo_coeff, field.mo_occ)


def _shifted(field: Any, density: Any) -> None:
    """Virtual orbitals raised and, where PySCF has it, new mixed with old; then freed and finished."""
    from pyscf import scf

    before = field.level_shift, field.damp, field.diis_start_cycle
    field.level_shift = SHIFT_Eh
    if not isinstance(field, scf.rohf.ROHF):  # ROHF damping is not implemented in PySCF
        field.damp, field.diis_start_cycle = DAMPING, 8
    try:
        field.kernel(dm0=density)
    finally:
        field.level_shift, field.damp, field.diis_start_cycle = before
    field.kernel(dm0=field.make_rdm1())


def _adiis(field: Any, density: Any) -> None:
    from pyscf import scf

    scheme, field.DIIS = field.DIIS, scf.ADIIS
    try:
        _diis(field, field.get_init_guess(key="1e"))
    finally:
        field.DIIS = scheme
    second_order(field, field.mo_coeff, field.mo_occ, cycles=50)
