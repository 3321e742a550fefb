"""Which electronic state a level took, which others there are, and whether the levels talk about the same one."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .constants import contact_coupling_MHz, mT_from_MHz
from .flag import Flag
from .nuclei import isotope
from .point import Point
from .properties.contact import spin_density_at_nuclei
from .state import Failure, Solution, State

NEAR_Eh = 0.03
"""Another stable solution within this (0.8 eV) could be the true ground state: methods err by as much."""
SAME_OPEN_SHELL = 0.5
"""Mean squared overlap of the singly occupied orbitals of two levels below which their states differ."""
PROJECTION_LIMIT = 0.1
"""Share of the largest UHF coupling that projection may change before it is told."""

DEGENERATE = {
    "atom": "the free atom's term is degenerate: this determinant is one of several, its dipolar tensor belongs to "
    "one orientation of the open shell, and only the isotropic coupling compares with an experiment",
    "linear": "a degenerate state of a linear molecule: this determinant puts the electron into one of two equal pi "
    "orbitals, the real one has both and orbital angular momentum; its spectrum is not that of a spin alone",
    "Jahn-Teller": "a degenerate open shell: the shape distorts in several equal ways, couplings of symmetry "
    "equivalents differ here and exchange in experiment; average them over the equivalents",
}


def solution_rows(point: Point, state: State, isotopes: Sequence[str | None]) -> list[dict[str, Any]]:
    """Rows of solutions.csv: every solution with the coupling of every nucleus."""
    lowest = min(solution.energy_Eh for solution in state.solutions)
    rows = []
    for place, solution in enumerate(state.solutions):
        density = spin_density_at_nuclei(solution.spin_density_matrix, state.ao_at_nuclei)
        for atom, label in enumerate(point.molecule.labels):
            name = isotopes[atom]
            coupling = None
            if name is not None:
                in_MHz = contact_coupling_MHz(
                    float(density[atom]), isotope(name).nuclear_g, point.molecule.multiplicity
                )
                coupling = mT_from_MHz(in_MHz)
            rows.append(
                {
                    "solution": place + 1,
                    "taken": place == state.taken,
                    "state_label": solution.label,
                    "energy_Eh": solution.energy_Eh,
                    "energy_above_lowest_Eh": solution.energy_Eh - lowest,
                    "s_squared": solution.s_squared,
                    "stable": solution.stable,
                    "origin": solution.origin,
                    "atom": label,
                    "isotope": name,
                    "a_iso_mT": coupling,
                }
            )
    return rows


def state_columns(state: State) -> dict[str, Any]:
    """What states.csv says about the choice among solutions."""
    return {
        "state_label": state.solution.label,
        "solution": state.taken + 1,
        "solutions_found": len(state.solutions),
        "energy_gap_to_next_Eh": gap_to_next(state),
    }


def gap_to_next(state: State) -> float | None:
    """Energy of the nearest other solution minus that of the one taken; None if there is no other."""
    gaps = [one.energy_Eh - state.energy_Eh for k, one in enumerate(state.solutions) if k != state.taken]
    return min(gaps, key=abs, default=None)


def state_flags(point: Point, state: State) -> list[Flag]:
    """Unstable, untested, not the lowest, another state near, degenerate."""
    level, flags = point.level.id, []
    curvature = state.engine.get("lowest_curvature_Eh")
    value = float(curvature) if isinstance(curvature, int | float) else None
    if state.stable is False:
        flags.append(
            Flag(
                "unstable",
                "bad",
                "a lower solution exists next to this one (value: curvature in Eh): do not use its couplings, "
                "take another solution of solutions.csv",
                value,
                0.0,
                level,
            )
        )
    if state.stable is None:
        flags.append(
            Flag(
                "stability-unknown",
                "note",
                "whether a lower solution exists next to this one could not be tested",
                level=level,
            )
        )
    lowest = min(one.energy_Eh for one in state.solutions)
    if state.energy_Eh - lowest > 1e-6:
        flags.append(
            Flag(
                "not-the-lowest",
                "caution",
                "a higher solution than the lowest was taken, as the level asks (value: how much higher, in Eh)",
                state.energy_Eh - lowest,
                0.0,
                level,
            )
        )
    near = [
        one
        for k, one in enumerate(state.solutions)
        if k != state.taken and one.stable is not False and abs(one.energy_Eh - state.energy_Eh) < NEAR_Eh
    ]
    if near:
        closest = min(near, key=lambda one: abs(one.energy_Eh - state.energy_Eh))
        flags.append(
            Flag(
                "another-state-near",
                "caution",
                f"another stable solution ({closest.label}) is within reach of the method's error (gap in Eh): "
                "compare its couplings in solutions.csv with experiment as well",
                abs(closest.energy_Eh - state.energy_Eh),
                NEAR_Eh,
                level,
            )
        )
    kind = state.engine.get("degenerate")
    if isinstance(kind, str) and kind in DEGENERATE:
        flags.append(Flag("degenerate", "caution", DEGENERATE[kind], level=level))
    return flags


def projection_flags(point: Point, couplings: Sequence[Mapping[str, Any]]) -> list[Flag]:
    """How much contamination matters for UHF: the largest change of a coupling by spin projection."""
    pairs = [
        (row["atom"], row["a_iso_mT"], row["a_iso_projected_mT"])
        for row in couplings
        if row.get("a_iso_mT") is not None and row.get("a_iso_projected_mT") is not None
    ]
    if point.level.scf != "UHF" or not pairs:
        return []
    atom, plain, pure = max(pairs, key=lambda pair: abs(pair[1] - pair[2]))
    limit = PROJECTION_LIMIT * max(abs(pair[1]) for pair in pairs)
    if abs(plain - pure) <= limit:
        return []
    return [
        Flag(
            "projection-matters",
            "caution",
            f"removing higher spins changes couplings much, most {atom}: {plain:+.3f} mT becomes {pure:+.3f} mT; "
            "experiment usually lies between",
            abs(plain - pure),
            limit,
            point.level.id,
        )
    ]


def disagreement_flags(points: Sequence[Point], outcomes: Sequence[State | Failure]) -> list[Flag]:
    """Levels of one radical that are in different electronic states, one flag for each level concerned."""
    states = [(p, o) for p, o in zip(points, outcomes, strict=True) if isinstance(o, State)]
    against: dict[str, list[str]] = {}
    for (first, one), (second, other) in combinations(states, 2):
        if not same_state(one, other):
            against.setdefault(first.level.id, []).append(f"{second.level.id} ({other.solution.label})")
            against.setdefault(second.level.id, []).append(f"{first.level.id} ({one.solution.label})")
    labels = {point.level.id: state.solution.label for point, state in states}
    return [
        Flag(
            "levels-disagree",
            "bad",
            f"this level found the state {labels[level]}, other than {', '.join(others)}: comparing couplings "
            "across these levels compares different states; ask a level for the other state with `solution:`",
            level=level,
        )
        for level, others in against.items()
    ]


def same_state(one: State, other: State) -> bool:
    """True if the open shells are the same: by symmetry species, else by their overlap in an equal basis.

    Partners of a degenerate state count as the same. Without a common basis or symmetry nothing is claimed: true.
    """
    labels = one.solution.label, other.solution.label
    if all(map(_names_species, labels)):
        return labels[0] == labels[1]
    if one.basis_functions != other.basis_functions or not np.allclose(one.overlap, other.overlap, atol=1e-8):
        return True
    if one.engine.get("degenerate") and other.engine.get("degenerate"):
        return True
    first, second = (open_shell(state.solution, state.overlap) for state in (one, other))
    common = np.linalg.norm(first.T @ one.overlap @ second) ** 2 / max(1, first.shape[1])
    return bool(common > SAME_OPEN_SHELL)


def open_shell(solution: Solution, overlap: NDArray[np.float64]) -> NDArray[np.float64]:
    """Alpha orbitals without a partner in beta (corresponding orbitals), shape (functions, 2S)."""
    pair = zip(solution.orbitals, solution.occupations, strict=True)
    alpha, beta = (orbitals[:, occupations > 0] for orbitals, occupations in pair)
    left, _, _ = np.linalg.svd(alpha.T @ overlap @ beta, full_matrices=True)
    return np.asarray(alpha @ left[:, beta.shape[1] :])


def _names_species(label: str) -> bool:
    """A label by symmetry has no populations in it."""
    return bool(label) and re.search(r"\d\.\d", label) is None
