"""Relaxing a structure with geomeTRIC on any surface."""

from __future__ import annotations

import logging
import tempfile
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..constants import BOHR_ANGSTROM
from ..errors import ConvergenceError
from .surface import Report

Floats = NDArray[np.float64]
Energies = Callable[[Floats], tuple[float, Floats]]
"""Coordinates (atoms, 3) in bohr to (energy in Eh, gradient (atoms, 3) in Eh/bohr): a Surface, for example."""


@dataclass(frozen=True)
class Thresholds:
    """When a relaxation is done; all five must hold. Gradients in Eh/bohr, displacements in angstrom."""

    energy_Eh: float = 1e-6
    gradient_rms: float = 5e-5
    gradient_max: float = 1e-4
    displacement_rms: float = 1e-3
    displacement_max: float = 2e-3


TIGHT = Thresholds()
LOOSE = Thresholds(1e-4, 1e-3, 2e-3, 1e-2, 2e-2)
MAX_STEPS = 150
ROUGH_STEPS = 30


@dataclass(frozen=True, eq=False)
class Relaxed:
    """The end of a relaxation."""

    coordinates_bohr: Floats
    """Shape (atoms, 3)."""
    energy_Eh: float
    gradient_max: float
    """Largest component, Eh/bohr."""
    steps: int


def relax(
    elements: tuple[str, ...],
    coordinates_bohr: Floats,
    surface: Energies,
    thresholds: Thresholds = TIGHT,
    report: Report | None = None,
    stage: str = "relax",
    rough: bool = False,
    hessian: Floats | None = None,
) -> Relaxed:
    """Walk downhill to a stationary structure (geomeTRIC, translation-rotation internal coordinates).

    L.-P. Wang, C. C. Song, J. Chem. Phys. 144, 214108 (2016). Raises ConvergenceError after MAX_STEPS;
    a rough relaxation ends with the lowest structure of ROUGH_STEPS at the latest. A Hessian (3 atoms, 3 atoms) of
    the start in Eh/bohr^2, even of a smaller basis set, saves about half of the steps.
    """
    start = np.asarray(coordinates_bohr, dtype=np.float64).reshape(-1, 3)
    if len(elements) == 1:
        return Relaxed(start, surface(start)[0], 0.0, 0)
    logging.getLogger("geometric").setLevel(logging.CRITICAL)
    from geometric import errors, internal, molecule, optimize, params

    seen = _Seen(elements, surface, report, stage)
    drawing = molecule.Molecule()
    drawing.elem = list(elements)
    drawing.xyzs = [start * BOHR_ANGSTROM]
    drawing.build_topology()
    options = params.OptParams(
        maxiter=ROUGH_STEPS if rough else MAX_STEPS,
        convergence_energy=thresholds.energy_Eh,
        convergence_grms=thresholds.gradient_rms,
        convergence_gmax=thresholds.gradient_max,
        convergence_drms=thresholds.displacement_rms,
        convergence_dmax=thresholds.displacement_max,
    )
    if hessian is not None:
        values, vectors = np.linalg.eigh((hessian + hessian.T) / 2)
        # a negative curvature would send the first step far along it (benzene cation: 80 kJ/mol uphill)
        options.hess_data, options.frequency = (vectors * abs(values)) @ vectors.T, False
    with tempfile.TemporaryDirectory(prefix="unpaired-") as scratch:
        try:
            coordinates = internal.DelocalizedInternalCoordinates(
                drawing, build=True, connect=False, addcart=False
            )
            engine = seen.engine(drawing)
            optimize.Optimizer(
                start.ravel(), drawing, coordinates, engine, scratch, options, print_info=False
            ).optimizeGeometry()
        except errors.GeomOptNotConvergedError:
            if rough:
                return seen.lowest
            raise ConvergenceError(
                f"the structure is not relaxed after {seen.steps} steps (largest gradient {seen.largest:.1e} "
                "Eh/bohr); start from a better structure or a SMILES"
            ) from None
    return Relaxed(seen.coordinates, seen.energy, seen.largest, seen.steps)


class _Seen:
    """Remembers the best step and reports each."""

    def __init__(
        self, elements: tuple[str, ...], surface: Energies, report: Report | None, stage: str
    ) -> None:
        self.elements, self.surface, self.report, self.stage = elements, surface, report, stage
        self.steps = 0
        self.energy = np.inf
        self.largest = np.inf
        self.coordinates: Floats = np.zeros((len(elements), 3))
        self.lowest = Relaxed(self.coordinates, np.inf, np.inf, 0)

    def engine(self, drawing: Any) -> Any:
        """geomeTRIC's view of the surface."""
        from geometric.engine import Engine

        seen = self

        class Ours(Engine):  # type: ignore[misc]
            def calc_new(self, coords: Floats, dirname: str) -> dict[str, Any]:
                return seen.calculate(coords)

        return Ours(drawing)

    def calculate(self, flat: Floats) -> dict[str, Any]:
        coordinates = np.array(flat, dtype=np.float64).reshape(-1, 3)
        energy, gradient = self.surface(coordinates)
        self.steps += 1
        if energy < self.lowest.energy_Eh:
            self.lowest = Relaxed(coordinates, energy, float(abs(gradient).max()), self.steps)
        self.energy, self.coordinates = energy, coordinates
        self.largest = float(abs(gradient).max())
        if self.report is not None:
            self.report(self.stage, self.steps, energy, self.largest)
        return {"energy": energy, "gradient": gradient.ravel()}
