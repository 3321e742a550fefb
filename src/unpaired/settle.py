"""Settling a structure: from a drawing or a rough start to minima that are proven."""

from __future__ import annotations

import time
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from .constants import BOHR_ANGSTROM, HARTREE_KJ_MOL
from .electronic.relax import LOOSE, TIGHT, Relaxed, relax
from .electronic.surface import FINAL_GRID, Report, Surface
from .errors import CalculationError, ConvergenceError
from .level import Level
from .molecule import Molecule
from .point import Solvent
from .proof import (
    ROUGH,
    ROUGH_BASIS,
    Curvature,
    Model,
    conformer_of,
    curvature_flags,
    curvature_of,
    equal_minima_flags,
    is_large,
    jahn_teller,
    model_hessian,
)
from .recipe.levels import DEFAULT_RELAX
from .recipe.recipe import Recipe
from .settled import WINDOW_KJ_MOL, Conformer, Settled, relative_kJ_mol, weigh
from .structures.conformers import SAME_ANGSTROM, SAME_Eh, alike_atoms, same_shape, starts
from .structures.smiles import Drawing, read_smiles
from .structures.symmetry import symmetrised

Floats = NDArray[np.float64]

ROUGH_WINDOW_KJ_MOL = 25.0
"""What the rough relaxation puts higher above the lowest is not relaxed further."""
ROUGH_SAME_Eh, ROUGH_SAME_ANGSTROM = 5e-3, 0.15
"""Structures alike after the rough relaxation: on its grid one CF3 turned in space differs by 2e-3 Eh."""
ROUNDS = 4
"""How often a negative mode is followed."""
DOWNHILL_ANGSTROM = (0.15, 0.3)
"""Largest displacement of an atom along a negative mode."""
SOFT_Eh, SOFT_ANGSTROM = 5e-6, 0.15
"""Structures that differ by less in energy and in every distance are one minimum with a soft motion."""
SYMMETRY_COST_Eh = 2e-6
"""Energy by which the symmetrised structure may lie higher than the relaxed one."""


@dataclass
class _Work:
    """What one settling has found so far."""

    recipe: Recipe
    level: Level
    surface: Surface
    report: Report | None
    story: list[str] = field(default_factory=list)
    seconds: dict[str, float] = field(default_factory=dict)

    @property
    def elements(self) -> tuple[str, ...]:
        return self.surface.molecule.elements

    def timed(self, stage: str, started: float) -> None:
        self.seconds[stage] = self.seconds.get(stage, 0.0) + time.perf_counter() - started


def settle(
    recipe: Recipe, report: Report | None = None, folder: Path | None = None, seed: int = 0
) -> Settled:
    """The structure of a recipe: as the file has it, or built, relaxed and proven.

    `report(stage, step, energy_Eh, largest_gradient)` is called after every step. With a folder (OUT/.store)
    every step is kept there, and a run that was killed goes on where it was. `seed` shakes the starts of a
    drawing differently. Raises StructureError for a drawing that cannot be used and CalculationError if no start
    could be relaxed.
    """
    if recipe.smiles is not None:
        return _from_drawing(recipe, read_smiles(recipe.smiles), report, folder, seed)
    if not recipe.relax:
        return unsettled(recipe)
    assert recipe.molecule is not None
    begin = [recipe.molecule.coordinates_bohr]
    return _relaxed(_work(recipe, recipe.molecule, report, folder), begin, f"from {recipe.structure}", None)


def unsettled(recipe: Recipe) -> Settled:
    """The structure before anything is relaxed: as the file has it, or the first start of the drawing."""
    if recipe.molecule is not None:
        said = f": {recipe.structure_comment}" if recipe.structure_comment else ""
        return Settled(recipe.molecule, f"{recipe.radical}, positions from {recipe.structure}{said}")
    assert recipe.smiles is not None
    drawing = read_smiles(recipe.smiles)
    coordinates = starts(drawing)[0] / BOHR_ANGSTROM
    molecule = Molecule(drawing.elements, coordinates, recipe.charge, recipe.multiplicity)
    return Settled(molecule, f"{recipe.radical}, drawn from SMILES {recipe.smiles}, not relaxed")


def prove(recipe: Recipe, report: Report | None = None, folder: Path | None = None) -> Settled:
    """Check the curvature of a recipe's structure file without moving a nucleus.

    The level is the recipe's `relax` or the default one. Raises CalculationError.
    """
    assert recipe.molecule is not None
    work = _work(recipe, recipe.molecule, report, folder)
    coordinates = recipe.molecule.coordinates_bohr
    gradient = work.surface(coordinates)[1]
    work.story.append(
        f"{work.level.id}: largest gradient {abs(gradient).max():.1e} Eh/bohr "
        f"({'stationary' if abs(gradient).max() < 1e-3 else 'not relaxed at this level'})"
    )
    energy = work.surface.final_energy_Eh(coordinates)
    conformer, _ = _proven(work, Relaxed(coordinates, energy, float(abs(gradient).max()), 1), None)
    note = f"{unsettled(recipe).note}; at {work.level.id} {_in_words(conformer)}"
    return _settled(work, [conformer], note, None)


def _work(recipe: Recipe, molecule: Molecule, report: Report | None, folder: Path | None) -> _Work:
    level = recipe.relax or DEFAULT_RELAX
    return _Work(recipe, level, Surface(molecule, level, recipe.solvent, folder), report)


def _from_drawing(
    recipe: Recipe, drawing: Drawing, report: Report | None, folder: Path | None, seed: int
) -> Settled:
    started = time.perf_counter()
    begin = [coordinates / BOHR_ANGSTROM for coordinates in starts(drawing, seed)]
    molecule = Molecule(drawing.elements, begin[0], recipe.charge, recipe.multiplicity)
    work = _work(recipe, molecule, report, folder)
    work.timed("drawing", started)
    unpaired = recipe.multiplicity - 1
    if drawing.open_valences != unpaired:
        work.story.append(
            f"the SMILES draws {drawing.open_valences} open valences, the multiplicity asks for {unpaired} "
            "unpaired electrons"
        )
    begin = _rough(work, begin, recipe.solvent, folder)
    return _relaxed(work, begin, f"from SMILES {drawing.smiles}", drawing)


def _rough(
    work: _Work, begin: Sequence[Floats], solvent: Solvent | None, folder: Path | None
) -> list[Floats]:
    """Starts after a quick relaxation in a small basis set, doubles and high ones removed, lowest first."""
    if len(work.elements) < 3:
        return list(begin)
    started = time.perf_counter()
    level = replace(work.level, basis=ROUGH_BASIS, name=None)
    found: list[tuple[float, Floats]] = []
    for place, coordinates in enumerate(begin, start=1):
        # Every start has a surface of its own: the density of another shape is a poor guess.
        surface = Surface(work.surface.molecule, level, solvent, folder, ROUGH)
        try:
            stage = f"rough {place}/{len(begin)}"
            end = relax(work.elements, coordinates, surface, LOOSE, work.report, stage, rough=True)
        except CalculationError as error:
            work.story.append(f"start {place}: {error.message}")
            continue
        found.append((end.energy_Eh, end.coordinates_bohr))
    work.timed("rough relaxation", started)
    if not found:
        raise ConvergenceError(f"none of {len(begin)} starts could be relaxed roughly: {work.story[-1]}")
    kept = _distinct(work.elements, found, ROUGH_WINDOW_KJ_MOL, loose=True)
    work.story.append(
        f"{len(begin)} starts, {len(kept)} of them distinct after a rough relaxation ({level.id})"
    )
    return [coordinates for _, coordinates in kept]


def _distinct(
    elements: Sequence[str], found: Sequence[tuple[float, Floats]], window_kJ_mol: float, loose: bool
) -> list[tuple[float, Floats]]:
    """The lowest of every shape within the window, by energy."""
    energy_tolerance, shape_tolerance = (
        (ROUGH_SAME_Eh, ROUGH_SAME_ANGSTROM) if loose else (SAME_Eh, SAME_ANGSTROM)
    )
    kept: list[tuple[float, Floats]] = []
    for energy, coordinates in sorted(found, key=lambda pair: pair[0]):
        if (energy - kept[0][0] if kept else 0.0) * HARTREE_KJ_MOL > window_kJ_mol:
            break
        if not any(
            abs(energy - other) < energy_tolerance
            and same_shape(elements, coordinates * BOHR_ANGSTROM, known * BOHR_ANGSTROM, shape_tolerance)
            for other, known in kept
        ):
            kept.append((energy, coordinates))
    return kept


def _relaxed(work: _Work, begin: Sequence[Floats], origin: str, drawing: Drawing | None) -> Settled:
    """Relax every start at the full level, prove each, and keep the distinct minima within the window."""
    found: list[Conformer] = []
    for place, coordinates in enumerate(begin, start=1):
        stage = f"relax {place}/{len(begin)}"
        try:
            _in_a_stable_state(work, coordinates)
            model = _model(work, coordinates)
            end = _stationary(work, coordinates, stage, model)
        except CalculationError as error:
            work.story.append(f"start {place}: {error.message}")
            continue
        work.story.append(
            f"start {place}: relaxed in {end.steps} steps to {end.energy_Eh:.6f} Eh "
            f"(largest gradient {end.gradient_max:.0e} Eh/bohr)"
        )
        if _known(work, end, found):
            work.story.append(f"start {place}: the same minimum as before")
            continue
        if found and (end.energy_Eh - found[0].energy_Eh) * HARTREE_KJ_MOL > WINDOW_KJ_MOL:
            work.story.append(f"start {place}: more than {WINDOW_KJ_MOL:.0f} kJ/mol too high")
            continue
        conformer = _downhill(work, end, stage, model)
        if not _known(work, conformer, found):
            found.append(conformer)
            found.sort(key=lambda one: one.energy_Eh)
    if not found:
        raise ConvergenceError(f"no start could be relaxed: {work.story[-1]}")
    kept = [
        conformer
        for conformer, above in zip(found, relative_kJ_mol(found), strict=True)
        if above <= WINDOW_KJ_MOL
    ]
    where = f"in {work.recipe.solvent.name}" if work.recipe.solvent else "gas phase"
    note = (
        f"{work.recipe.radical}, relaxed at {work.level.id} (density fitting, grid "
        f"{work.surface.settings.grid_level}, energy on grid {FINAL_GRID}, {where}) {origin}, {kept[0].energy_Eh:.7f} Eh, "
        f"{_in_words(kept[0])}"
    )
    return _settled(work, kept, note, drawing)


def _in_words(conformer: Conformer) -> str:
    if conformer.lowest_mode_cm is None:
        return "no vibrations" if conformer.minimum else "curvature not checked"
    kind = {True: "minimum", False: "not a minimum", None: "not proven to be a minimum"}[conformer.minimum]
    return f"{kind} (lowest mode {conformer.lowest_mode_cm:.0f} cm^-1)"


def _known(work: _Work, one: Relaxed | Conformer, found: Sequence[Conformer]) -> bool:
    """True if a structure is one of those found already; a soft motion may leave it a little elsewhere."""
    angstrom = one.coordinates_bohr * BOHR_ANGSTROM
    return any(
        abs(one.energy_Eh - other.energy_Eh) < energy
        and same_shape(work.elements, angstrom, other.molecule.coordinates_angstrom, shape)
        for other in found
        for energy, shape in ((SAME_Eh, SAME_ANGSTROM), (SOFT_Eh, SOFT_ANGSTROM))
    )


def _model(work: _Work, coordinates: Floats) -> Model | None:
    """A Hessian in a small basis set, for the steps and for the proof, where these are dear."""
    if not is_large(work.surface):
        return None
    started = time.perf_counter()
    if work.report is not None:
        work.report("model Hessian", 0, np.nan, np.nan)
    model = model_hessian(work.surface, coordinates)
    work.timed("model Hessian", started)
    return model


def _stationary(work: _Work, start: Floats, stage: str, model: Model | None = None) -> Relaxed:
    """A stationary structure, its symmetry made exact, with its energy on the final grid."""
    hessian = None if model is None else model.hessian
    started = time.perf_counter()
    end = relax(work.elements, start, work.surface, TIGHT, work.report, stage, hessian=hessian)
    end = _as_symmetric_as_it_is(work, end)
    work.timed("relaxation", started)
    return replace(end, energy_Eh=work.surface.final_energy_Eh(end.coordinates_bohr))


def _downhill(work: _Work, end: Relaxed, stage: str, model: Model | None) -> Conformer:
    """Prove a stationary structure; follow a negative mode and relax again until it is a minimum."""
    conformer, mode = _proven(work, end, model)
    for turn in range(ROUNDS):
        if conformer.minimum is not False or mode is None or conformer.lowest_mode_cm is None:
            break
        work.story.append(
            f"mode at {-conformer.lowest_mode_cm:.0f}i cm^-1: a saddle, followed downhill from "
            f"{end.energy_Eh:.6f} Eh"
        )
        reach = DOWNHILL_ANGSTROM[min(turn, 1)] / BOHR_ANGSTROM / float(abs(mode).max())
        aside = [end.coordinates_bohr + sign * reach * mode for sign in (1.0, -1.0)]
        start = min(aside, key=lambda coordinates: work.surface(coordinates)[0])
        end = _stationary(work, start, f"{stage} downhill")
        work.story.append(f"relaxed again in {end.steps} steps to {end.energy_Eh:.6f} Eh")
        conformer, mode = _proven(work, end, model)
    return conformer


def _in_a_stable_state(work: _Work, coordinates: Floats) -> None:
    """Begin the relaxation on the lowest electronic state near the one that the guess leads to."""
    if len(work.elements) == 1 or work.surface.knows(coordinates):
        return
    started = time.perf_counter()
    found = work.surface.steady(coordinates)
    work.timed("stability", started)
    if found:
        work.story.append(found)


def _as_symmetric_as_it_is(work: _Work, end: Relaxed) -> Relaxed:
    """The structure with its approximate symmetry made exact, if that costs no energy."""
    angstrom = end.coordinates_bohr * BOHR_ANGSTROM
    exact = symmetrised(work.elements, angstrom) / BOHR_ANGSTROM
    if abs(exact - end.coordinates_bohr).max() < 1e-9:
        return end
    energy, gradient = work.surface(exact)
    if energy > end.energy_Eh + SYMMETRY_COST_Eh:
        return end
    return Relaxed(exact, energy, float(abs(gradient).max()), end.steps + 1)


def _proven(work: _Work, end: Relaxed, model: Model | None) -> tuple[Conformer, Floats | None]:
    """The structure with its lowest mode, and the mode's displacement (atoms, 3)."""
    started = time.perf_counter()
    if work.report is not None:
        work.report("curvature", 0, end.energy_Eh, end.gradient_max)
    try:
        found = curvature_of(work.surface, end.coordinates_bohr, model)
    except CalculationError as error:  # the structure is worth keeping without its proof
        found = Curvature(None, None, None, None, f"curvature not checked: {error.message}")
    work.timed("curvature", started)
    work.story.append(found.story)
    return conformer_of(work.surface, end.coordinates_bohr, end.energy_Eh, found), found.displacement


def _settled(work: _Work, kept: list[Conformer], note: str, drawing: Drawing | None) -> Settled:
    weights, with_zero_point = weigh(kept, work.recipe.temperature_K)
    lowest = kept[0]
    flags = curvature_flags(lowest)
    distorted = jahn_teller(work.surface, lowest)
    if distorted is not None:
        flags.append(distorted[0])
        work.story.append(distorted[1])
    alike = alike_atoms(drawing, lowest.molecule) if drawing is not None else ()
    flags += equal_minima_flags(lowest, alike)
    return Settled(
        molecule=lowest.molecule,
        note=note,
        minimum=lowest.minimum,
        lowest_mode_cm=lowest.lowest_mode_cm,
        conformers=tuple(kept),
        weights=weights,
        with_zero_point=with_zero_point,
        story=tuple(work.story),
        flags=tuple(flags),
        seconds=tuple(work.seconds.items()),
        alike=alike,
    )
