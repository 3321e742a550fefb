"""What is proven of a relaxed structure: its curvature, its electronic state, and a Jahn-Teller distortion."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from .constants import BOHR_ANGSTROM, HARTREE_KJ_MOL
from .electronic.hessian import analytic_hessian, difference_hessian, forward_hessian, forward_product
from .electronic.settings import Settings
from .electronic.sizes import basis_functions
from .electronic.surface import CURVATURE_GRID, Surface
from .errors import ConvergenceError
from .flag import Flag
from .point import Point
from .settled import Conformer
from .structures.groups import freely_turning
from .structures.modes import FLAT_CM, lowest_mode, masses_u, normal_modes
from .structures.symmetry import equivalence, operations, symmetrised

Floats = NDArray[np.float64]

ROUGH_BASIS = "pcseg-0"
ROUGH = Settings("def2-universal-jkfit", 0, 1e-7, 1e-4)
"""Basis set and settings of what only has to be roughly right: first relaxations, model Hessians."""
FULL_HESSIAN_FUNCTIONS = 60
"""Up to this many basis functions the full analytic Hessian is the cheapest proof."""
MODEL_HESSIAN_FUNCTIONS = 110
"""Up to this many functions in ROUGH_BASIS its Hessian is worth its time as a model."""
CONVERGED_CM = 100.0
"""An iterated lowest mode counts if its residual is below this."""
JAHN_TELLER_MAX_ANGSTROM = 0.12
JAHN_TELLER_GRADIENT = 2e-3
"""Eh/bohr towards the minimum at the more symmetric structure. By symmetry it is zero unless the state is
degenerate there; then the slope is linear (H. A. Jahn, E. Teller, Proc. R. Soc. A 161, 220 (1937))."""


@dataclass(frozen=True, eq=False)
class Curvature:
    """The lowest vibration of a stationary structure."""

    minimum: bool | None
    wavenumber_cm: float | None
    """None for an atom; negative stands for imaginary."""
    displacement: Floats | None
    """Shape (atoms, 3), Cartesian, length 1."""
    zero_point_Eh: float | None
    story: str


@dataclass(frozen=True, eq=False)
class Model:
    """A rough Hessian and the structure that it belongs to."""

    coordinates_bohr: Floats
    hessian: Floats

    def at(self, coordinates_bohr: Floats) -> Floats:
        """The Hessian turned as the structure has turned since (best rotation of all nuclei)."""
        from scipy.spatial.transform import Rotation

        centred = [x - x.mean(axis=0) for x in (coordinates_bohr, self.coordinates_bohr)]
        turn = np.kron(np.eye(len(coordinates_bohr)), Rotation.align_vectors(*centred)[0].as_matrix())
        return np.asarray(turn @ self.hessian @ turn.T)


def curvature_of(surface: Surface, coordinates_bohr: Floats, model: Model | None = None) -> Curvature:
    """The lowest mode of a structure (atoms, 3): from the full Hessian for small molecules, else by iteration.

    The iteration multiplies the Hessian by directions (gradient differences) and is led by the Hessian of a
    smaller basis set: that of `model`, or one made here.
    """
    elements = surface.molecule.elements
    if len(elements) == 1:
        return Curvature(True, None, None, 0.0, "an atom has no vibrations")
    masses = masses_u(elements)
    surface = surface.on_grid(CURVATURE_GRID)
    if not is_large(surface):
        # PySCF's second derivatives of a continuum take longer than all gradient differences together
        hessian = analytic_hessian(surface, coordinates_bohr) if surface.solvent is None else None
        how = "full Hessian"
        if hessian is None:
            hessian, how = difference_hessian(surface, coordinates_bohr), "Hessian by gradient differences"
        modes = normal_modes(hessian, coordinates_bohr, masses)
        wavenumber = float(modes.wavenumbers_cm[0])
        return Curvature(
            None if abs(wavenumber) < FLAT_CM else wavenumber > 0,
            wavenumber,
            modes.displacements[0],
            modes.zero_point_Eh,
            f"lowest mode {wavenumber:.0f} cm^-1 ({how})",
        )
    model = model or model_hessian(surface, coordinates_bohr)
    leading = 0.5 * np.eye(coordinates_bohr.size) if model is None else model.at(coordinates_bohr)
    name = "no model" if model is None else f"the Hessian in {ROUGH_BASIS}"
    found = lowest_mode(forward_product(surface, coordinates_bohr), leading, coordinates_bohr, masses)
    # some mode lies within the residual of ours: it must not reach below zero
    clear = found.residual_cm <= CONVERGED_CM and found.wavenumber_cm >= max(FLAT_CM, found.residual_cm)
    # A negative curvature along any direction proves a saddle, converged or not.
    minimum = False if found.wavenumber_cm <= -FLAT_CM else (True if clear else None)
    return Curvature(
        minimum,
        found.wavenumber_cm,
        found.displacement,
        None,
        f"lowest mode {found.wavenumber_cm:.0f} cm^-1 (iterated on {found.products + 1} gradients, led by "
        f"{name}; residual {found.residual_cm:.0f} cm^-1)",
    )


def is_large(surface: Surface) -> bool:
    """True if a full Hessian costs more than a few gradients led by a model."""
    functions = basis_functions(Point(surface.molecule, surface.level))
    return functions > FULL_HESSIAN_FUNCTIONS and len(surface.molecule.elements) > 3


def model_hessian(surface: Surface, coordinates_bohr: Floats) -> Model | None:
    """A cheap Hessian that knows which directions are soft: gas phase, ROUGH_BASIS; None if it is not cheap."""
    molecule = surface.molecule.moved(coordinates_bohr)
    level = replace(surface.level, basis=ROUGH_BASIS, name=None)
    if basis_functions(Point(molecule, level)) > MODEL_HESSIAN_FUNCTIONS:
        return None
    rough = Surface(molecule, level, None, surface.folder, ROUGH)
    try:
        return Model(coordinates_bohr, forward_hessian(rough, coordinates_bohr))
    except ConvergenceError:
        return None


def conformer_of(surface: Surface, coordinates_bohr: Floats, energy_Eh: float, found: Curvature) -> Conformer:
    """The record of a stationary structure."""
    molecule = surface.molecule.moved(coordinates_bohr)
    return Conformer(
        molecule,
        energy_Eh,
        found.minimum,
        found.wavenumber_cm,
        found.zero_point_Eh,
        len(operations(molecule.elements, molecule.coordinates_angstrom)),
    )


def curvature_flags(lowest: Conformer) -> list[Flag]:
    """A flag for a structure that is no minimum, or that might be none."""
    if lowest.minimum is False:
        advice = (
            "the structure is no minimum: couplings belong to a place where the radical is not; "
            "relax it (relax: true) or start from another structure"
        )
        return [Flag("saddle", "bad", advice, lowest.lowest_mode_cm, 0.0)]
    if lowest.minimum is None and lowest.lowest_mode_cm is None:
        advice = "the curvature could not be checked: look at the story in record.json"
        return [Flag("curvature-unknown", "caution", advice)]
    if lowest.minimum is None and abs(lowest.lowest_mode_cm or 0.0) >= FLAT_CM:
        advice = (
            "the lowest mode was not found closely enough to prove a minimum: look at the story in record.json, and "
            "check the structure in a smaller basis set (unpaired structure --prove)"
        )
        return [Flag("curvature-unknown", "caution", advice, lowest.lowest_mode_cm)]
    if lowest.minimum is None:
        advice = (
            "the softest motion is so flat that the curvature proves nothing; couplings that depend on it "
            "need an average over it"
        )
        return [Flag("flat-mode", "note", advice, lowest.lowest_mode_cm, FLAT_CM)]
    return []


def equal_minima_flags(lowest: Conformer, alike: Sequence[int]) -> list[Flag]:
    """A note for atoms that are the same on paper and differ in this structure; methyl groups do not count.

    `alike` has one number per atom, equal for atoms that turning or inverting can exchange; it may be empty.
    """
    molecule = lowest.molecule
    turning = {atom for _, _, ligands in freely_turning(molecule) for atom in ligands}
    sets = equivalence(molecule.elements, molecule.coordinates_angstrom)
    place = {atom: number for number, members in enumerate(sets) for atom in members}
    split: dict[int, list[int]] = {}
    for atom, number in enumerate(alike):
        if atom not in turning:
            split.setdefault(number, []).append(atom)
    lists = [
        "[" + ", ".join(molecule.labels[atom] for atom in atoms) + "]"
        for atoms in split.values()
        if len({place[atom] for atom in atoms}) > 1
    ]
    if not lists:
        return []
    advice = (
        f"{', '.join(lists)} are equal on paper and differ in this minimum, so it has equal copies; if these "
        f"interconvert fast, the spectrum shows the mean: groups: [{', '.join(lists)}]"
    )
    return [Flag("equal-minima", "note", advice, float(len(lists)), 0.0)]


def jahn_teller(surface: Surface, lowest: Conformer) -> tuple[Flag, str] | None:
    """Flag and sentence for a minimum that is one of several around a degenerate, more symmetric structure."""
    elements, angstrom = lowest.molecule.elements, lowest.molecule.coordinates_angstrom
    wide = (JAHN_TELLER_MAX_ANGSTROM / 2, JAHN_TELLER_MAX_ANGSTROM)
    wider = operations(elements, angstrom, *wide)
    threefold = any(_order(permutation) > 2 for permutation, _ in wider)
    if len(wider) <= lowest.order or not threefold:
        return None
    centre = symmetrised(elements, angstrom, *wide)
    way = (angstrom - centre) / BOHR_ANGSTROM
    try:
        gradient = surface(centre / BOHR_ANGSTROM)[1]
    except ConvergenceError:
        return None
    slope = float((gradient * way).sum() / np.linalg.norm(way))
    if abs(slope) < JAHN_TELLER_GRADIENT:
        return None
    copies = len(wider) // lowest.order
    depth = (surface.final_energy_Eh(centre / BOHR_ANGSTROM) - lowest.energy_Eh) * HARTREE_KJ_MOL
    advice = (
        f"one of {copies} equal minima that interconvert, {depth:.1f} kJ/mol below the symmetric structure: a "
        "spectrum shows the mean; name the nuclei that become equal under groups:"
    )
    sentence = (
        f"the structure with {len(wider)} symmetry operations lies {depth:.1f} kJ/mol higher and slopes down "
        "linearly: a Jahn-Teller distortion"
    )
    return Flag("jahn-teller", "caution", advice, depth, 0.0), sentence


def _order(permutation: NDArray[np.intp]) -> int:
    """How often a permutation must be repeated until every atom is back."""
    start = np.arange(len(permutation))
    image, times = permutation.copy(), 1
    while (image != start).any():
        image, times = permutation[image], times + 1
    return times
