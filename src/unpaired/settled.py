"""A settled structure: where the nuclei are, how that came about, and what is proven of it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from .constants import BOLTZMANN_EH_K, HARTREE_KJ_MOL
from .flag import Flag
from .molecule import Molecule

WINDOW_KJ_MOL = 10.0
"""Minima further above the lowest one are left out."""


@dataclass(frozen=True, eq=False)
class Conformer:
    """One stationary structure of a radical."""

    molecule: Molecule
    energy_Eh: float
    """Electronic energy at the level of the relaxation."""
    minimum: bool | None
    """True if its curvature was checked and is positive; None is not known."""
    lowest_mode_cm: float | None
    """Lowest wavenumber; negative stands for imaginary."""
    zero_point_Eh: float | None
    """Harmonic zero-point energy; None without a full Hessian at the level of the relaxation."""
    order: int
    """Number of symmetry operations. A structure with fewer exists in more equal copies."""

    @property
    def coordinates_bohr(self) -> NDArray[np.float64]:
        """Shape (atoms, 3)."""
        return self.molecule.coordinates_bohr


@dataclass(frozen=True, eq=False)
class Settled:
    """The structure that a recipe's levels are computed at."""

    molecule: Molecule
    """The lowest conformer."""
    note: str
    """How it was made: the comment of structure.xyz."""
    minimum: bool | None = None
    lowest_mode_cm: float | None = None
    conformers: tuple[Conformer, ...] = ()
    """Distinct minima, lowest first; empty if the structure was taken as it is."""
    weights: tuple[float, ...] = ()
    """Boltzmann weights of the conformers at the recipe's temperature."""
    with_zero_point: bool = False
    """True if the weights hold zero-point energies."""
    story: tuple[str, ...] = ()
    """What happened, one sentence each."""
    flags: tuple[Flag, ...] = ()
    seconds: tuple[tuple[str, float], ...] = ()
    """Wall time per stage."""
    alike: tuple[int, ...] = ()
    """Per atom a number: atoms with the same number are the same on paper. Empty if there was no drawing."""


def weigh(conformers: Sequence[Conformer], temperature_K: float) -> tuple[tuple[float, ...], bool]:
    """Boltzmann weights and whether zero-point energies are in them (they are if every conformer has one).

    A conformer with fewer symmetry operations exists in more equal copies and counts that often: weight
    proportional to exp(-E/kT)/order (rigid-rotor statistics, common practice).
    """
    with_zero_point = all(conformer.zero_point_Eh is not None for conformer in conformers)
    energies = [c.energy_Eh + (c.zero_point_Eh or 0.0 if with_zero_point else 0.0) for c in conformers]
    lowest = min(energies)
    if temperature_K <= 0:
        factors = [float(energy == lowest) for energy in energies]
    else:
        factors = [
            math.exp(-(energy - lowest) / (BOLTZMANN_EH_K * temperature_K)) / conformer.order
            for energy, conformer in zip(energies, conformers, strict=True)
        ]
    return tuple(factor / sum(factors) for factor in factors), with_zero_point


def relative_kJ_mol(conformers: Sequence[Conformer]) -> tuple[float, ...]:
    """Electronic energies above the lowest."""
    lowest = min(conformer.energy_Eh for conformer in conformers)
    return tuple((conformer.energy_Eh - lowest) * HARTREE_KJ_MOL for conformer in conformers)
