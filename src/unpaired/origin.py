"""From a state to rows: where its spin density is and why it is there."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .constants import contact_coupling_MHz, mT_from_MHz
from .electronic.integrals import field_gradients, minimal_basis
from .minimal import BeyondMinimalBasis
from .nuclei import isotope
from .point import Point
from .properties import projection
from .properties.contact import spin_density_at_nuclei
from .properties.corresponding import Corresponding, corresponding_orbitals, occupied
from .properties.dipolar import COMPONENTS, dipolar_tensor_MHz, principal
from .properties.partition import direct_at_nuclei, localised_pairs, pi_functions
from .properties.populations import spin_populations
from .state import State
from .structures.groups import Group

Rows = list[dict[str, Any]]

CONTAMINANTS = 4
"""So many spins above S are listed in the record."""


@dataclass
class Origin:
    """What the spin density of one state is made of, as rows that do not yet name radical and level."""

    atoms: Rows
    """Columns of couplings.csv, one entry per atom."""
    state: dict[str, Any] = field(default_factory=dict)
    """Columns of states.csv."""
    polarisation: Rows = field(default_factory=list)
    populations: Rows = field(default_factory=list)
    details: dict[str, Any] = field(default_factory=dict)
    """For the record: weights of contaminants, axes of the dipolar tensors, what is missing and why."""
    weakest_pair: float | None = None
    """Smallest overlap of an alpha orbital with its beta partner; None where all are equal by construction."""


def spin_origin(
    point: Point, state: State, groups: Sequence[Group], isotopes: Sequence[str | None]
) -> Origin:
    """Projection, direct and polarisation part, dipolar tensors, populations of one state."""
    solution = state.solution
    nuclei = Nuclei(point.molecule.labels, isotopes, groups, point.molecule.multiplicity)
    found = Origin(atoms=[{} for _ in nuclei.labels])
    pairs = corresponding_orbitals(*occupied(solution.orbitals, solution.occupations), state.overlap)
    density = spin_density_at_nuclei(solution.spin_density_matrix, state.ao_at_nuclei)
    add_dipolar(found, nuclei, density, field_gradients(point, solution.spin_density_matrix))
    if point.level.scf == "UHF":
        add_projection(found, nuclei, pairs, state)
    add_parts(found, nuclei, pairs, state, density, point.level.is_unrestricted)
    if point.level.is_unrestricted and len(pairs.overlaps):
        found.weakest_pair = float(pairs.overlaps[-1])
    try:
        minimal = minimal_basis(point)
        pi = pi_functions(point.molecule.coordinates_bohr, minimal)
        alpha, beta = occupied(solution.orbitals, solution.occupations)
        add_populations(found, nuclei, *spin_populations(alpha, beta, state.overlap, minimal, pi))
        if point.level.is_unrestricted:
            add_pairs(
                found,
                nuclei,
                [
                    (pair.name(nuclei.labels), pair.kind, pair.spin_density_au)
                    for pair in localised_pairs(pairs, state.overlap, state.ao_at_nuclei, minimal, pi)
                ],
            )
    except BeyondMinimalBasis as reason:
        found.details["populations"] = f"no populations and no local pairs: {reason.message}"
        if point.level.is_unrestricted:
            rest = density - direct_at_nuclei(pairs, state.ao_at_nuclei)
            add_pairs(found, nuclei, [("all", "not localised", rest)])
    return found


@dataclass(frozen=True)
class Nuclei:
    """The nuclei of a molecule and how their spin densities become couplings."""

    labels: tuple[str, ...]
    isotopes: Sequence[str | None]
    groups: Sequence[Group]
    multiplicity: int

    def coupling_MHz(self, atom: int, spin_density_au: float) -> float | None:
        """Contact coupling, or None for an element without a magnetic isotope."""
        name = self.isotopes[atom]
        if name is None:
            return None
        return contact_coupling_MHz(float(spin_density_au), isotope(name).nuclear_g, self.multiplicity)

    def coupling_mT(self, atom: int, spin_density_au: float) -> float | None:
        """The same in mT at g_e."""
        value = self.coupling_MHz(atom, spin_density_au)
        return None if value is None else mT_from_MHz(value)


def add_projection(found: Origin, nuclei: Nuclei, pairs: Corresponding, state: State) -> None:
    """Couplings of the part of pure spin; for UHF only (see properties/projection.py)."""
    projected = projection.project(pairs)
    density = spin_density_at_nuclei(projected.spin_density_matrix, state.ao_at_nuclei)
    for atom, row in enumerate(found.atoms):
        row["a_iso_projected_MHz"] = nuclei.coupling_MHz(atom, density[atom])
        row["a_iso_projected_mT"] = nuclei.coupling_mT(atom, density[atom])
    for group in nuclei.groups:
        mean = float(density[list(group.sites)].mean())
        for atom in group.members:
            found.atoms[atom]["a_group_projected_mT"] = nuclei.coupling_mT(atom, mean)
    found.state["pure_spin_weight"] = projected.pure_spin_weight
    found.state["s_squared_without_next_spin"] = projection.s_squared_without_next_spin(pairs)
    weights = projection.spin_weights(pairs, 1 + CONTAMINANTS)
    spins = pairs.unmatched.shape[1] / 2 + np.arange(len(weights))
    found.details["weights_of_spins"] = [
        {"spin": float(spin), "weight": float(weight)} for spin, weight in zip(spins, weights, strict=True)
    ]


def add_parts(
    found: Origin,
    nuclei: Nuclei,
    pairs: Corresponding,
    state: State,
    density: NDArray[np.float64],
    unrestricted: bool,
) -> None:
    """Direct and polarisation part; the second is zero by construction where pairs share their orbital."""
    direct = direct_at_nuclei(pairs, state.ao_at_nuclei) if unrestricted else density
    for atom, row in enumerate(found.atoms):
        row["direct_mT"] = nuclei.coupling_mT(atom, direct[atom])
        row["polarisation_mT"] = nuclei.coupling_mT(atom, density[atom] - direct[atom])


def add_pairs(found: Origin, nuclei: Nuclei, pairs: Sequence[tuple[str, str, NDArray[np.float64]]]) -> None:
    """Rows of the polarisation table: (name, kind, spin density at the nuclei) of every local pair."""
    for atom, label in enumerate(nuclei.labels):
        if nuclei.isotopes[atom] is None:
            continue
        found.polarisation += [
            {
                "atom": label,
                "pair": name,
                "kind": kind,
                "contribution_mT": nuclei.coupling_mT(atom, density[atom]),
            }
            for name, kind, density in pairs
        ]


def add_populations(
    found: Origin, nuclei: Nuclei, total: NDArray[np.float64], pi: NDArray[np.float64] | None
) -> None:
    """Rows of the populations table."""
    found.populations = [
        {
            "atom": label,
            "spin_population": float(total[atom]),
            "pi_spin_population": None if pi is None else float(pi[atom]),
        }
        for atom, label in enumerate(nuclei.labels)
    ]


def add_dipolar(
    found: Origin, nuclei: Nuclei, density: NDArray[np.float64], gradients: NDArray[np.float64]
) -> None:
    """Dipolar tensors and principal values, axes in the record."""
    axes_of: dict[str, Any] = {}
    for atom, row in enumerate(found.atoms):
        name, contact = nuclei.isotopes[atom], nuclei.coupling_MHz(atom, density[atom])
        if name is None or contact is None:
            continue
        tensor = dipolar_tensor_MHz(gradients[atom], isotope(name).nuclear_g, nuclei.multiplicity)
        values, axes = principal(tensor)
        row |= {f"t_{letters}_MHz": float(tensor[place]) for letters, place in COMPONENTS.items()}
        row |= {f"t_{place}_MHz": float(value) for place, value in enumerate(values, start=1)}
        row |= {f"A_{place}_MHz": contact + float(value) for place, value in enumerate(values, start=1)}
        axes_of[nuclei.labels[atom]] = axes.tolist()
    found.details["dipolar_axes"] = axes_of
