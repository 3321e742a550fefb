"""Every stationary state of one mean field that a set of starts leads to; each tested, each followed down."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .converge import converge, second_order
from .degeneracy import degeneracy
from .guess import density_from_nuclei, excited, symmetrised, turned
from .labels import spin_populations, state_label, symmetry_of
from .stability import Verdict, internal_stability

Array = NDArray[np.float64]

SAME_ENERGY_Eh = 2e-6
SAME_ENERGY_ON_GRID_Eh = 1e-5
"""For equal labels: a grid tells the members of a degenerate state apart by this much."""
SAME_S_SQUARED = 2e-3
WINDOW_Eh = 0.15
"""Solutions higher than this above the lowest are not kept (4 eV)."""
NEAR_Eh = 0.08
"""Solutions up to this above the lowest matter (2 eV): sought in the larger basis, varied where that is affordable."""
START_WINDOW_Eh = 0.3
"""An electron is moved if the energy rises by less than this before the orbitals follow: they win back up to half."""
MOST_VARIED = 5
DEEP_HIGH = {False: (3, 1), True: (4, 2)}
"""How many of the highest occupied and lowest empty orbitals electrons are moved between; if thorough or not."""
CONTAMINATED = {"UHF": 0.10, "UKS": 0.05}
"""Excess of <S^2> from which a solution is suspect: the upper band of the physics notes."""
NEARLY_DEGENERATE_Eh = 0.05
"""Lowest curvature below which another solution is likely near."""
SLOW_ITERATIONS = 40
DOWNHILL_ROUNDS = 6
KNOWN_Eh = 1e-4
KNOWN_DISTANCE = 1e-3
"""A descent this near a stable solution in energy and density (electrons squared) is on its way into it: stopped."""
TOO_HIGH_STEPS = 10
"""A descent above the window whose last step would have to be repeated this often to reach it is given up."""
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

    @cached_property
    def density(self) -> Array:
        """Density matrices of both spins, shape (2, functions, functions)."""
        orbitals, occupations = self.both_spins()
        return np.asarray((orbitals * occupations[:, None, :]) @ orbitals.transpose(0, 2, 1))

    def is_like(self, other: Found) -> bool:
        """True within the tolerances that tell solutions apart; mirror images count as one."""
        limit = SAME_ENERGY_ON_GRID_Eh if self.label == other.label else SAME_ENERGY_Eh
        return (
            abs(self.energy_Eh - other.energy_Eh) < limit
            and abs(self.s_squared - other.s_squared) < SAME_S_SQUARED
        )


class Enough(Exception):
    """A descent is stopped: where it leads is known, or of no interest."""


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
        self._outer = field.callback
        self._descending = False
        field.callback = self._watch

    def _watch(self, local: dict[str, Any]) -> None:
        """Called in every iteration; raises Enough where going on would tell nothing new."""
        if self._outer is not None:
            self._outer(local)
        energy, density = float(local["e_tot"]), local.get("dm")
        for known in self.found:
            if (
                density is None
                or known.stable is False
                or not 0 <= energy - known.energy_Eh + SAME_ENERGY_Eh < KNOWN_Eh
            ):
                continue
            apart = (np.asarray(density) - known.density) @ self._overlap
            if float(np.einsum("sij,sji->", apart, apart)) < KNOWN_DISTANCE:
                raise Enough
        if self._descending and self.found:
            above = energy - (self.lowest.energy_Eh + WINDOW_Eh)
            if above > TOO_HIGH_STEPS * abs(float(local["last_hf_e"]) - energy):
                raise Enough

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
        try:
            return self._from_density(density, origin, trust)
        except Enough:
            return ()

    def _from_density(self, density: Any, origin: str, trust: Trust | None) -> tuple[str, ...]:
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
        try:
            if self._descend(orbitals, occupations):
                self._settle(origin, trust)
        except Enough:
            return

    def _descend(self, orbitals: Array, occupations: Array) -> bool:
        """Second order with the occupations kept; True if it converged. Raises Enough."""
        self._descending = True
        try:
            second_order(self.field, orbitals, occupations)
        except (np.linalg.LinAlgError, FloatingPointError, ValueError):
            return False
        finally:
            self._descending = False
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
        degenerate = degeneracy(field.mol, orbitals, occupations, self._overlap)
        return replace(
            found,
            label=named.text,
            by_symmetry=named.by_symmetry,
            # a component of a degenerate species may lie between the axes: that breaks nothing
            broken=bool(self._symmetry.species) and not named.by_symmetry and degenerate != "Jahn-Teller",
            degenerate=degenerate,
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

    def more_starts(self, other: Callable[[], Iterator[tuple[str, Any]]], thorough: bool = False) -> None:
        """Core Hamiltonian, `other` densities, then changes of the lowest solution: see `_vary`.

        `thorough`: changes of every solution near the lowest, those found on the way included.
        """
        name = "core Hamiltonian"
        self.from_density(density_from_nuclei(self.field, name), name)
        for name, density in other():
            self.from_density(density, name)
        if not self.found:
            return
        varied = [self.lowest]
        tried: set[float] = set()
        self._vary(varied[0], tried, thorough)
        while thorough and len(varied) < MOST_VARIED:
            top = self.lowest.energy_Eh + NEAR_Eh
            fresh = [one for one in self.found if one.energy_Eh < top and one not in varied]
            if not fresh:
                break
            varied.append(min(fresh, key=lambda found: found.energy_Eh))
            self._vary(varied[-1], tried, thorough)

    def _vary(self, base: Found, tried: set[float], thorough: bool) -> None:
        """Starts from a solution: frontier orbitals turned into each other, symmetry restored, electrons moved.

        An electron is moved only where that costs little at first, and once among moves that cost the same, which
        symmetry makes equal: `tried` collects the energies.
        """
        orbitals, occupations = base.both_spins()
        if base.orbitals.ndim == 3:
            self.from_density(turned(orbitals, occupations), "alpha HOMO and LUMO turned into each other")
            if thorough:
                mixed = turned(orbitals, occupations, 45.0, -45.0)
                self.from_density(mixed, "HOMO and LUMO turned oppositely in alpha and beta")
        if thorough and self._symmetry.species:
            whole = symmetrised(base.density, self._symmetry.species.values(), self._overlap)
            self.from_density(whole, "the symmetric part of a density")
        deep, high = DEEP_HIGH[thorough]
        for name, changed in excited(base.occupations, base.orbital_energies, deep, high):
            start = float(self.field.energy_tot(self.field.make_rdm1(base.orbitals, changed)))
            if round(start, 6) in tried or start > self.lowest.energy_Eh + START_WINDOW_Eh:
                continue
            tried.add(round(start, 6))
            self.from_orbitals(base.orbitals, changed, name)

    def kept(self) -> list[Found]:
        """Distinct solutions within the window, lowest first."""
        ordered = sorted(self.found, key=lambda found: found.energy_Eh)
        top = self.lowest.energy_Eh + WINDOW_Eh
        return [found for found in ordered if found.energy_Eh <= top or found is self.lowest]
