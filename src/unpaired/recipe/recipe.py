"""A Recipe: one radical and everything that is asked about it, validated, frozen."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass, field
from pathlib import Path
from typing import Any, Literal

from ..level import Level
from ..molecule import Molecule
from ..point import Solvent

Sign = Literal["+", "-", "unknown"]


@dataclass(frozen=True)
class Motion:
    """Which motions the couplings are averaged over."""

    rotors: bool = True
    """Freely turning XH3 and XF3: their nuclei are one group."""
    inversion: bool = False
    torsion: bool = False
    vibration: bool = False


@dataclass(frozen=True)
class MeasuredG:
    """The measured g value."""

    value: float
    source: str


@dataclass(frozen=True)
class Measured:
    """One measured splitting."""

    atoms: tuple[str, ...] | None
    """Labels of the nuclei that it is assigned to; None if unassigned."""
    count: int
    """Number of equivalent nuclei."""
    coupling_mT: float
    """Signed where `sign` is + or -, a magnitude where it is unknown."""
    sign: Sign
    source: str


@dataclass(frozen=True, eq=False)
class Recipe:
    """One radical, its levels, and what is known from experiment."""

    radical: str
    path: Path
    """The recipe file, as it was given."""
    structure: str | None
    """The structure path as the recipe writes it; None for SMILES."""
    smiles: str | None
    molecule: Molecule | None
    """The structure read from the file; None for SMILES, whose structure has yet to be settled."""
    charge: int
    multiplicity: int
    """2S+1."""
    levels: tuple[Level, ...]
    structure_comment: str = ""
    """What the structure file says about itself."""
    solvent: Solvent | None = None
    """None is the gas phase."""
    isotopes: Mapping[str, str] = field(default_factory=dict)
    """Isotope by atom label, only where the recipe (or the structure file) names one."""
    groups: tuple[tuple[str, ...], ...] = ()
    """Sets of atom labels that the user knows to be averaged."""
    relax: Literal[False] | Level = False
    """The level at which the structure is relaxed first."""
    motion: Motion = Motion()
    temperature_K: float = 298.0
    temperature_assumed: bool = True
    """True if the recipe does not name the temperature."""
    g: MeasuredG | None = None
    measured: tuple[Measured, ...] = ()

    def to_dict(self) -> dict[str, Any]:
        """The recipe as understood, defaults filled in, as plain data for JSON; holds no absolute path."""
        return {
            "radical": self.radical,
            "recipe_file": self.path.name,
            "structure": self.structure if self.smiles is None else {"smiles": self.smiles},
            "charge": self.charge,
            "multiplicity": self.multiplicity,
            "levels": [level.to_dict() for level in self.levels],
            "solvent": asdict(self.solvent) if self.solvent else None,
            "isotopes": dict(sorted(self.isotopes.items())),
            "groups": [list(group) for group in self.groups],
            "relax": self.relax.to_dict() if self.relax else False,
            "motion": asdict(self.motion),
            "temperature_K": self.temperature_K,
            "temperature_assumed": self.temperature_assumed,
            "g": asdict(self.g) if self.g else None,
            "measured": [
                {**asdict(value), "atoms": list(value.atoms) if value.atoms else None}
                for value in self.measured
            ],
        }
