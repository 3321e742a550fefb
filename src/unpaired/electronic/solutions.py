"""Every stationary state of one mean field that a set of starts leads to; each tested, each followed down."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .converge import converge, second_order
from .guess import density_from_nuclei, excited, turned
from .labels import degeneracy, spin_populations, state_label, symmetry_of
from .stability import Verdict, internal_stability

Array = NDArray[np.float64]

SAME_ENERGY_Eh = 2e-6
SAME_ENERGY_ON_GRID_Eh = 1e-5
"""For equal labels: a grid tells the members of a degenerate state apart by this much."""
SAME_S_SQUARED = 2e-3
WINDOW_Eh = 0.15
"""Solutions higher than this above the lowest are not kept (4 eV)."""
CONTAMINATED = {"UHF": 0.10, "UKS": 0.05}
"""Excess of <S^2> from which a solution is suspect: the upper band of the physics notes."""
NEARLY_DEGENERATE_Eh = 0.05
"""Lowest curvature below which another solution is likely near."""
SLOW_ITERATIONS = 40
DOWNHILL_ROUNDS = 6
STEPS = (-0.8, -0.4, -0.15, 0.15, 0.4, 0.8)
"""Angles (radian) tried along an unstable direction."""


@dataclass(frozen=True, eq=False)
class Found:
    """A stationary state in the shape of the field's own arrays."""

    energy_Eh: float
    s_squared: float
    orbitals: Array
    occupations: Array
    orbital_energies: Array
    origin: str
    verdict: Verdict
    label: str = ""
    by_symmetry: bool = False
    """The label names symmetry species, not populations."""
    broken: bool = False
    """The open shell has less symmetry than the nuclei."""
    degenerate: str = ""

    @property
    def stable(self) -> bool | None:
        return self.verdict.stable

    def both_spins(self) -> tuple[Array, Array]:
        """Orbitals (2, functions, orbitals) and occupations (2, orbitals)."""
        if self.orbitals.ndim == 3:
            return self.orbitals, self.occupations
        occupations = np.stack([self.occupations > 0, self.occupations > 1]).astype(float)
        return np.stack([self.orbitals, self.orbitals]), occupations

    def is_like(self, other: Found) -> bool:
        """True within the tolerances that tell solutions apart; mirror images count as one."""
        limit = SAME_ENERGY_ON_GRID_Eh if self.label == other.label else SAME_ENERGY_Eh
        return (
            abs(self.energy_Eh - other.energy_Eh) < limit
            and abs(self.s_squared - other.s_squared) < SAME_S_SQUARED
        )


Trust = Callable[[Found], Verdict | None]
"""Verdict on a solution that was judged elsewhere, or None to have it tested."""


class Explorer:
    """Collects the stationary states of one field; `field` is worked on and left at the last of them."""

    def __init__(self, field: Any) -> None:
        self.field = field
        self.found: list[Found] = []
        self.carried: list[Found] = []
        """Solutions of another basis that were sought here already."""
        self.story: list[str] = []
        self.starts = 0
        self._most_iterations = 0
        self._symmetry = symmetry_of(field.mol)
        self._overlap = np.asarray(field.get_ovlp())

    @property
    def point_group(self) -> str:
        """Of the nuclei."""
        return self._symmetry.group

    @property
    def lowest(self) -> Found:
        """The lowest solution that is not known to be unstable, else the lowest of all."""
        pool = [found for found in self.found if found.stable is not False] or self.found
        return min(pool, key=lambda found: found.energy_Eh)

    def from_density(self, density: Any, origin: str, trust: Trust | None = None) -> tuple[str, ...]:
        """Converge from a density by the ladder, test, follow down. Returns the rungs used.

        `trust` may give the verdict on what is found without a test.
        """
        self.starts += 1
        rungs = converge(self.field, density)
        if not self.field.converged:
            self.story.append(f"the start from {origin} did not converge ({', then '.join(rungs)})")
            return rungs
        if len(rungs) > 1:
            self.story.append(f"the start from {origin} needed {', then '.join(rungs)}")
        elif self.field.cycles > SLOW_ITERATIONS:
            self.story.append(f"the start from {origin} took {self.field.cycles} iterations")
        self._most_iterations = max(self._most_iterations, self.field.cycles)
        self._settle(origin, trust)
        return rungs

    def from_orbitals(
        self, orbitals: Array, occupations: Array, origin: str, trust: Trust | None = None
    ) -> None:
        """Second-order descent with the occupations kept, test, follow down."""
        self.starts += 1
        if self._descend(orbitals, occupations):
            self._settle(origin, trust)

    def _descend(self, orbitals: Array, occupations: Array) -> bool:
        try:
            second_order(self.field, orbitals, occupations)
        except (np.linalg.LinAlgError, FloatingPointError, ValueError):
            return False
        return bool(self.field.converged and np.isfinite(self.field.e_tot))

    def _settle(self, origin: str, trust: Trust | None) -> None:
        for round_ in range(DOWNHILL_ROUNDS):
            found = self._describe(origin)
            if any(known.is_like(found) for known in self.found):
                return
            if self.found and round_ == 0 and found.energy_Eh > self.lowest.energy_Eh + WINDOW_Eh:
                return
            known_verdict = trust(found) if trust is not None and round_ == 0 else None
            if known_verdict is not None:
                self.found.append(replace(found, verdict=known_verdict))
                return
            verdict, hessian = internal_stability(self.field)
            self.found.append(replace(found, verdict=verdict))
            if verdict.stable is not False or hessian is None or verdict.direction is None:
                return
            self.story.append(
                f"the solution at {found.energy_Eh:.6f} Eh ({found.label}; from {origin}) is unstable, curvature "
                f"{verdict.lowest_Eh:.4f} Eh, and was followed down"
            )
            occupations = np.array(self.field.mo_occ)
            trials = [hessian.rotated(step * verdict.direction) for step in STEPS]
            energies = [self.field.energy_tot(self.field.make_rdm1(c, occupations)) for c in trials]
            best = int(np.argmin(np.round(energies, 8)))
            if not self._descend(trials[best], occupations):
                self.story.append("the way down from there did not converge")
                return
            origin = "downhill from " + origin.removeprefix("downhill from ")

    def _describe(self, origin: str) -> Found:
        field = self.field
        found = Found(
            float(field.e_tot),
            float(field.spin_square()[0]),
            np.array(field.mo_coeff),
            np.array(field.mo_occ),
            np.array(field.mo_energy),
            origin,
            Verdict(None, None),
        )
        orbitals, occupations = found.both_spins()
        named = state_label(field.mol, self._symmetry, orbitals, occupations, self._overlap)
        return replace(
            found,
            label=named.text,
            by_symmetry=named.by_symmetry,
            broken=bool(self._symmetry.species) and not named.by_symmetry,
            degenerate=degeneracy(field.mol, orbitals, occupations),
        )

    def suspicions(self, rungs: tuple[str, ...], method: str, spin: float) -> tuple[str, ...]:
        """Why the solutions found so far should not be the last word."""
        lowest = self.lowest
        reasons = []
        if any(found.stable is False for found in self.found):
            reasons.append("unstable")
        scale = (2 * spin + 2) / 3  # the weight of the next spin is about D/(2S+2)
        if lowest.s_squared - spin * (spin + 1) > CONTAMINATED.get(method, np.inf) * scale:
            reasons.append("contaminated")
        if lowest.verdict.lowest_Eh is not None and lowest.verdict.lowest_Eh < NEARLY_DEGENERATE_Eh:
            reasons.append("nearly degenerate")
        if lowest.broken:
            reasons.append("symmetry broken")
        if len(rungs) > 1 or self._most_iterations > SLOW_ITERATIONS:
            reasons.append("slow")
        return tuple(reasons)

    def populations(self, found: Found) -> Array:
        """Spin populations of the atoms."""
        return spin_populations(self.field.mol, *found.both_spins(), self._overlap)

    def more_starts(
        self, other: Callable[[], Iterator[tuple[str, Any]]], deep: int = 3, high: int = 1
    ) -> None:
        """Core Hamiltonian, turned orbitals, `other` densities, electrons moved at the frontier."""
        name = "core Hamiltonian"
        self.from_density(density_from_nuclei(self.field, name), name)
        for name, density in other():
            self.from_density(density, name)
        if not self.found:
            return
        base = self.lowest
        if base.orbitals.ndim == 3:
            self.from_density(turned(*base.both_spins()), "alpha HOMO and LUMO turned into each other")
        for name, occupations in excited(base.occupations, base.orbital_energies, deep, high):
            self.from_orbitals(base.orbitals, occupations, name)

    def kept(self) -> list[Found]:
        """Distinct solutions within the window, lowest first."""
        ordered = sorted(self.found, key=lambda found: found.energy_Eh)
        top = self.lowest.energy_Eh + WINDOW_Eh
        return [found for found in ordered if found.energy_Eh <= top or found is self.lowest]
