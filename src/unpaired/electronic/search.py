"""Which solutions a point has: scouted in a small basis where that is cheaper, then found in its own."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from .. import catalogue
from ..errors import ChoiceError, ConvergenceError
from ..level import Level
from ..point import Point
from .guess import density_from_nuclei, projected
from .meanfield import mean_field
from .mole import build_mole
from .settings import SCOUT
from .solutions import Explorer, Found, NEAR_Eh
from .stability import Verdict

Watch = Callable[[dict[str, Any]], None]

SCOUT_BASIS = "pcseg-0"
SCOUT_FROM = 25
"""Basis functions from which a scout in a small basis is sent ahead."""
SCOUT_SHARE = 0.67
"""Largest share of the functions that the small basis may have to be worth the detour."""
SCOUT_SURFACE = 9
"""Order of the spheres' grids that make the scout's continuum."""
SMALL_ATOMS = 2
"""Molecules up to this size are searched, suspect or not: it costs little and they surprise most."""
FEW_ATOMS = 3
"""The search of molecules up to this size is thorough."""
TROUBLED = frozenset({"not converged", "unstable", "contaminated", "symmetry broken"})
"""Suspicions for which a small molecule is searched in the point's own basis after the scout's."""
MOST = 4
CLEARLY_STABLE_Eh = 0.03
"""A scout's lowest curvature above this settles the stability of the same state in the larger basis."""
SAME_STATE = 0.12
"""Largest difference of a spin population, and of <S^2>, between a scouted state and the same state after it."""


@dataclass(frozen=True, eq=False)
class Outcome:
    """What a search found, lowest first."""

    found: tuple[Found, ...]
    story: tuple[str, ...]
    suspicions: tuple[str, ...]
    """Why more than one start was made; empty if one was enough."""
    starts: int
    point_group: str


def search(point: Point, field: Any, start: str, watch: Watch) -> Outcome:
    """Solutions of `field`, the point's mean field. Raises ConvergenceError if no start leads to one."""
    spin = point.molecule.spin
    atoms = len(point.molecule.elements)
    small, few = atoms <= SMALL_ATOMS, atoms <= FEW_ATOMS
    always = (small or point.level.solution is not None) and field.mol.natm > 1 and field.mol.nelectron > 1
    own = Explorer(field)
    scout = _scout(point, field, watch)
    first = scout or own
    rungs = first.from_density(density_from_nuclei(first.field, start), start)

    def look_around() -> None:
        if first.starts == 1:
            first.more_starts(lambda: _other_methods(point, first.field), thorough=few)

    suspicions: tuple[str, ...] = ("not converged",)
    if not first.found:
        look_around()
    else:
        suspicions = first.suspicions(rungs, point.level.scf, spin)
        if suspicions or always:
            look_around()
    if scout is not None:
        own_rungs = _carry(scout, own, wide=point.level.solution is not None)
        more = own.suspicions(own_rungs, point.level.scf, spin) if own.found else ("not converged",)
        if scout.starts == 1 and more:
            suspicions = tuple(dict.fromkeys((*suspicions, *more)))
            look_around()
            _carry(scout, own, wide=False)
        if not own.found:
            own.from_density(density_from_nuclei(field, start), start)
            if not own.found:
                own.more_starts(lambda: _other_methods(point, field))
        elif own.lowest.stable is False or (small and TROUBLED.intersection(suspicions)):
            own.more_starts(lambda: iter(()), thorough=few)
    if not own.found:
        raise ConvergenceError("not converged: " + "; ".join(own.story))
    if not suspicions and first.starts > 1:
        suspicions = ("small molecule",)
    story = ([f"in {SCOUT_BASIS}: {line}" for line in scout.story] if scout else []) + own.story
    return Outcome(
        tuple(own.kept()), tuple(story), suspicions, max(first.starts, own.starts), own.point_group
    )


def _scout(point: Point, field: Any, watch: Watch) -> Explorer | None:
    """An explorer in the small basis with a coarse grid, or None where there is nothing to save."""
    if field.mol.nao < SCOUT_FROM or point.level.basis == SCOUT_BASIS:
        return None
    try:
        catalogue.check_basis(SCOUT_BASIS, point.molecule.elements)
    except ChoiceError:
        return None
    level = replace(point.level, basis=SCOUT_BASIS, accuracy="quick")
    mole = build_mole(replace(point, level=level))
    if mole.nao > SCOUT_SHARE * field.mol.nao:
        return None
    small = mean_field(mole, level, point.solvent, SCOUT)
    small.callback = watch
    if point.solvent is not None:
        small.with_solvent.lebedev_order = SCOUT_SURFACE
    return Explorer(small)


def _carry(scout: Explorer, own: Explorer, wide: bool) -> tuple[str, ...]:
    """Seek the scout's solutions in the larger basis; returns the rungs that the lowest one needed.

    The lowest and the stable ones near it; `wide` takes the unstable and the high ones as well.
    """
    if not scout.found:
        return ()
    lowest = scout.lowest
    others = [one for one in scout.kept() if one is not lowest]
    if not wide:
        top = lowest.energy_Eh + NEAR_Eh
        others = [one for one in others if one.stable is not False and one.energy_Eh < top][: MOST - 1]
    rungs: tuple[str, ...] = ()
    for one in [lowest, *others]:
        if one in own.carried:
            continue
        own.carried.append(one)
        orbitals, occupations = _projected(scout, own, one)
        trust = _trust(scout, own, one)
        used = own.from_density(own.field.make_rdm1(orbitals, occupations), one.origin, trust)
        if one is lowest:
            rungs = used
    return rungs


def _trust(scout: Explorer, own: Explorer, seen: Found) -> Callable[[Found], Verdict | None]:
    """Verdict of the scout on a state of the larger basis, if it is clear and the state is the same."""

    def judge(found: Found) -> Verdict | None:
        lowest = seen.verdict.lowest_Eh
        if own.field.mol.charge < 0:  # without diffuse functions the small basis binds an anion differently
            return None
        if seen.stable is not True or (lowest is not None and lowest < CLEARLY_STABLE_Eh):
            return None
        apart = np.abs(scout.populations(seen) - own.populations(found)).max()
        if apart > SAME_STATE or abs(seen.s_squared - found.s_squared) > SAME_STATE:
            return None
        if seen.broken != found.broken or (found.by_symmetry and seen.label != found.label):
            return None
        return replace(seen.verdict, direction=None, note=f"judged in {SCOUT_BASIS}")

    return judge


def _projected(scout: Explorer, own: Explorer, found: Found) -> tuple[Any, Any]:
    small, large = scout.field.mol, own.field.mol
    if found.orbitals.ndim == 2:
        return projected(small, large, found.orbitals, found.occupations)
    parts = [projected(small, large, c, n) for c, n in zip(found.orbitals, found.occupations, strict=True)]
    return np.stack([c for c, _ in parts]), np.stack([n for _, n in parts])


def _other_methods(point: Point, field: Any) -> Iterator[tuple[str, Any]]:
    """Densities of other methods on the same molecule: restricted-open, and Hartree-Fock or a functional."""
    level = point.level
    functional = level.functional
    others = {
        "UHF": (Level("ROHF", level.basis), Level("UKS", level.basis, "B3LYP")),
        "ROHF": (Level("UHF", level.basis), Level("ROKS", level.basis, "B3LYP")),
        "UKS": (Level("ROKS", level.basis, functional), Level("UHF", level.basis)),
        "ROKS": (Level("UKS", level.basis, functional), Level("ROHF", level.basis)),
    }
    for other in others[level.scf]:
        rough = mean_field(field.mol, other, None, SCOUT)
        rough.conv_tol, rough.max_cycle = 1e-6, 50
        try:
            rough.kernel()
        except (np.linalg.LinAlgError, FloatingPointError, ValueError):
            continue
        if rough.converged:
            density = np.asarray(rough.make_rdm1())
            yield (
                f"the {other.method} solution",
                density if density.ndim == 3 else np.stack([density / 2] * 2),
            )
