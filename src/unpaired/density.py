"""The spin density of a stored state in a plane or in a box."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import machine
from .electronic.integrals import spin_density_on
from .errors import InputError, RecordError, nearest
from .level import Level
from .molecule import Molecule
from .point import Point, Solvent
from .properties.grids import (
    FLAT_BOHR,
    Box,
    Plane,
    box_around,
    labelled_atoms,
    molecular_plane,
    plane_through,
)
from .result import Result
from .state import State
from .store import Store

PLANE_MARGIN_BOHR = 4.0
PLANE_SPACING_BOHR = 0.06
BOX_MARGIN_BOHR = 7.0
BYTES_PER_POINT = 8 + 14 + 2 * 14
"""Value, text, and the text once more while it is put together and written."""


@dataclass(frozen=True, eq=False)
class PlaneDensity:
    """Spin density in a plane."""

    plane: Plane
    across_bohr: NDArray[np.float64]
    upwards_bohr: NDArray[np.float64]
    values_au: NDArray[np.float64]
    """bohr^-3, shape (rows, columns)."""


def stored_state(result: Result, place: Path, level_id: str) -> tuple[Point, State]:
    """The point of a level and its state, from the store beside the folder of a result.

    Raises RecordError if the level failed or its state is not in the store (another version made it).
    """
    from .electronic.settings import identity

    folder = place if place.is_dir() else place.parent
    (entry,) = (level for level in result.recipe["levels"] if level["id"] == level_id)
    level = Level(**{name: value for name, value in entry.items() if name != "id"})
    solvent: dict[str, Any] | None = result.recipe["solvent"]
    point = Point(result.molecule, level, Solvent(**solvent) if solvent else None)
    state = Store(folder.resolve().parent, identity).load(point)
    if state is None:
        raise RecordError(
            f"{place}: the orbitals of {level_id} are not in the store beside it (the level failed, or another "
            "version computed it); run the recipe again"
        )
    return point, state


def choose_plane(molecule: Molecule, atoms: Sequence[str] | None) -> Plane:
    """The plane of three named atoms, or that of the molecule for None.

    Raises InputError for atoms that make no plane, and for None if the nuclei do not lie in one.
    """
    coordinates = molecule.coordinates_bohr
    if atoms is None:
        plane, distance = molecular_plane(coordinates, PLANE_MARGIN_BOHR)
        if distance > FLAT_BOHR:
            raise InputError(
                f"the nuclei do not lie in one plane (up to {distance:.2f} bohr from the best): name three "
                f"atoms with --plane, such as --plane {','.join(molecule.labels[:3])}"
            )
        return plane
    if len(atoms) != 3:
        raise InputError(f"--plane {','.join(atoms)}: give three atoms, such as C1,C2,H4")
    try:
        places = labelled_atoms(molecule.labels, atoms)
        return plane_through(coordinates[places], coordinates, PLANE_MARGIN_BOHR)
    except ValueError as error:
        wrong = next((atom for atom in atoms if atom not in molecule.labels), "")
        hint = nearest(wrong, molecule.labels) if wrong else ""
        raise InputError(f"--plane {','.join(atoms)}: {error}{hint}") from None


def density_in_plane(point: Point, state: State, plane: Plane) -> PlaneDensity:
    """Spin density on the points of a plane."""
    across, upwards = plane.axes_bohr(PLANE_SPACING_BOHR)
    values = spin_density_on(point, state.solution.spin_density_matrix, plane.points_bohr(PLANE_SPACING_BOHR))
    return PlaneDensity(plane, across, upwards, values.reshape(len(upwards), len(across)))


def choose_box(molecule: Molecule, spacing_bohr: float) -> Box:
    """A box around the molecule. Raises InputError if its points do not fit into memory."""
    if not spacing_bohr > 0:
        raise InputError(f"--spacing-bohr {spacing_bohr:g}: must be above 0")
    box = box_around(molecule.coordinates_bohr, BOX_MARGIN_BOHR, spacing_bohr)
    needed, there = box.size * BYTES_PER_POINT, machine.memory_bytes()
    if needed > there:
        fits = spacing_bohr * (needed / there) ** (1 / 3)
        raise InputError(
            f"--spacing-bohr {spacing_bohr:g}: the box has {box.size:.2e} points and needs {needed / 1e9:.1f} GB, "
            f"{there / 1e9:.1f} GB are free; take {1.05 * fits:.2g} or more"
        )
    return box


def density_in_box(point: Point, state: State, box: Box) -> NDArray[np.float64]:
    """Spin density on the points of a box, x running fastest, shape (points,); its sum times the volume is 2S."""
    matrix = state.solution.spin_density_matrix
    return np.concatenate(
        [spin_density_on(point, matrix, box.slab_bohr(layer)) for layer in range(box.counts[2])]
    )
