"""From a state to rows: every property that is taken from it, plugged together in one place.

To add a property, write a function over arrays in `properties/`, name its columns in `columns.py`, and add
its part here.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from . import diagnostics, solutions
from .basis_errors import basis_error_flags
from .constants import contact_coupling_MHz, mT_from_MHz
from .electronic.threads import suited_to
from .flag import Flag
from .molecule import Molecule
from .nuclei import isotope
from .origin import Origin, spin_origin
from .point import Point
from .properties.contact import spin_density_at_nuclei
from .state import Failure, State
from .structures.groups import Group


@dataclass
class Part:
    """What one level adds to the record."""

    tables: dict[str, list[dict[str, Any]]]
    """Rows per table without the columns that name radical and level."""
    flags: list[Flag]
    details: dict[str, Any] = field(default_factory=dict)


def analyse(point: Point, state: State, groups: Sequence[Group], isotopes: Sequence[str | None]) -> Part:
    """Everything that is read off one finished state."""
    part = Part(
        tables={
            "couplings": atom_rows(point.molecule, groups, isotopes),
            "states": [state_row(point, state) | solutions.state_columns(state)],
            "solutions": solutions.solution_rows(point, state, isotopes),
        },
        flags=[],
        details={"story": list(state.story), "engine": dict(state.engine)},
    )
    add_couplings(part, point, state, groups)
    with suited_to(state.basis_functions):
        origin = spin_origin(point, state, groups, isotopes)
    add_origin(part, origin)
    part.flags += diagnostics.parts_flags(point, origin.weakest_pair)
    part.flags += solutions.state_flags(point, state)
    part.flags += diagnostics.contamination_flags(state, point)
    part.flags += solutions.projection_flags(point, part.tables["couplings"])
    part.flags += diagnostics.exaggeration_flags(point)
    part.flags += diagnostics.restricted_flags(point)
    part.flags += diagnostics.high_spin_flags(point)
    part.flags += diagnostics.heavy_atom_flags(point)
    part.flags += diagnostics.no_isotope_flags(point, isotopes)
    part.flags += diagnostics.contracted_basis_flags(point, isotopes)
    part.flags += basis_error_flags(point, isotopes)
    part.flags += diagnostics.broken_symmetry_flags(
        point, state, groups, [row["a_iso_MHz"] for row in part.tables["couplings"]]
    )
    return part


def across_levels(points: Sequence[Point], outcomes: Sequence[State | Failure]) -> list[Flag]:
    """Flags that only a comparison of the levels of one radical can raise."""
    return solutions.disagreement_flags(points, outcomes)


def atom_rows(
    molecule: Molecule, groups: Sequence[Group], isotopes: Sequence[str | None]
) -> list[dict[str, Any]]:
    """One row per atom with its names and no numbers yet."""
    group_of = {member: group for group in groups for member in group.members}
    return [
        {
            "atom": label,
            "isotope": isotopes[place],
            "group": group_of[place].label if place in group_of else label,
            "group_size": len(group_of[place].members) if place in group_of else 1,
        }
        for place, label in enumerate(molecule.labels)
    ]


def state_row(point: Point, state: State) -> dict[str, Any]:
    """The row of states.csv."""
    spin = point.molecule.spin
    return {
        "basis_functions": state.basis_functions,
        "energy_Eh": state.energy_Eh,
        "s_squared": state.s_squared,
        "s_squared_exact": spin * (spin + 1),
        "contamination": diagnostics.contamination(state, point),
        "converged": True,
        "stable": state.stable,
        "iterations": state.iterations,
        "wall_s": state.wall_s,
    }


def add_couplings(part: Part, point: Point, state: State, groups: Sequence[Group]) -> None:
    """Contact couplings of every nucleus and the means of its group."""
    density = spin_density_at_nuclei(state.solution.spin_density_matrix, state.ao_at_nuclei)
    mean = group_means(density, groups)
    for place, row in enumerate(part.tables["couplings"]):
        row["spin_density_au"] = float(density[place])
        nuclear_g = isotope(row["isotope"]).nuclear_g if row["isotope"] else None
        row["a_iso_MHz"] = row["a_iso_mT"] = row["a_group_mT"] = None
        if nuclear_g is not None:
            multiplicity = point.molecule.multiplicity
            row["a_iso_MHz"] = contact_coupling_MHz(float(density[place]), nuclear_g, multiplicity)
            row["a_iso_mT"] = mT_from_MHz(row["a_iso_MHz"])
            row["a_group_mT"] = mT_from_MHz(contact_coupling_MHz(float(mean[place]), nuclear_g, multiplicity))


def add_origin(part: Part, origin: Origin) -> None:
    """Where the spin density is and why, beside the couplings."""
    for row, more in zip(part.tables["couplings"], origin.atoms, strict=True):
        row |= more
    part.tables["states"][0] |= origin.state
    part.tables["polarisation"] = origin.polarisation
    part.tables["populations"] = origin.populations
    part.details |= origin.details


def group_means(values: np.ndarray[Any, Any], groups: Sequence[Group]) -> np.ndarray[Any, Any]:
    """Every atom's value replaced by the mean over the places that its group visits.

    In CH2D the two protons and the deuteron are two groups that visit the same three places: the mean is over
    all three, whichever isotope sits there when the structure is frozen.
    """
    means = np.array(values, dtype=float)
    for group in groups:
        means[list(group.members)] = values[list(group.sites)].mean()
    return means
