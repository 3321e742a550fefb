"""Couplings over the conformers of a radical: one row per conformer and nucleus, and their thermal mean."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from .constants import HARTREE_KJ_MOL, contact_coupling_MHz, mT_from_MHz
from .nuclei import isotope
from .properties.contact import spin_density_at_nuclei
from .settled import Settled, relative_kJ_mol
from .state import Failure, State
from .structures.groups import Group, united


def conformer_rows(
    settled: Settled, outcomes: Sequence[State | Failure], isotopes: Sequence[str | None]
) -> list[dict[str, Any]]:
    """Rows of conformers.csv for one level; `outcomes` has one entry per conformer, in their order."""
    rows = []
    above = relative_kJ_mol(settled.conformers)
    for place, (conformer, outcome) in enumerate(zip(settled.conformers, outcomes, strict=True)):
        zero_point = conformer.zero_point_Eh
        shared: dict[str, Any] = {
            "conformer": place + 1,
            "relative_kJ_mol": above[place],
            "zero_point_kJ_mol": None if zero_point is None else zero_point * HARTREE_KJ_MOL,
            "weight": settled.weights[place],
            "minimum": conformer.minimum,
            "lowest_mode_cm": conformer.lowest_mode_cm,
        }
        densities = None if isinstance(outcome, Failure) else _densities(outcome)
        for atom, label in enumerate(conformer.molecule.labels):
            value = None
            if densities is not None:
                value = _coupling_mT(float(densities[atom]), isotopes[atom], settled.molecule.multiplicity)
            rows.append(shared | {"atom": label, "isotope": isotopes[atom], "a_iso_mT": value})
    return rows


def averaged_mT(
    settled: Settled,
    outcomes: Sequence[State | Failure],
    isotopes: Sequence[str | None],
    groups: Sequence[Group],
) -> list[float | None] | None:
    """Thermal mean of every nucleus's coupling in mT over conformers and their equal copies.

    A conformer of low symmetry has copies in which atoms that are the same on paper have changed places, so the
    mean also runs over those, and over the members of every group. None if a conformer gave no state, or if there
    is nothing to average over.
    """
    if len(settled.conformers) < 2:
        return None
    states = [outcome for outcome in outcomes if isinstance(outcome, State)]
    if len(states) < len(outcomes):
        return None
    mean = sum(weight * _densities(state) for weight, state in zip(settled.weights, states, strict=True))
    alike: dict[int, list[int]] = {}
    for atom, number in enumerate(settled.alike):
        alike.setdefault(number, []).append(atom)
    sets = united([*(tuple(atoms) for atoms in alike.values()), *(group.sites for group in groups)])
    values = np.array(mean)
    for atoms in sets:
        values[list(atoms)] = values[list(atoms)].mean()
    multiplicity = settled.molecule.multiplicity
    return [
        _coupling_mT(float(value), name, multiplicity) for value, name in zip(values, isotopes, strict=True)
    ]


def _densities(state: State) -> np.ndarray[Any, np.dtype[np.float64]]:
    return np.asarray(spin_density_at_nuclei(state.solution.spin_density_matrix, state.ao_at_nuclei))


def _coupling_mT(density: float, name: str | None, multiplicity: int) -> float | None:
    if name is None:
        return None
    return mT_from_MHz(contact_coupling_MHz(density, isotope(name).nuclear_g, multiplicity))
