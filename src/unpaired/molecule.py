"""A molecule as the engine sees it: nuclei in bohr, charge and multiplicity, frozen."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from .constants import BOHR_ANGSTROM
from .errors import StructureError

SYMBOLS = (  # noqa: SIM905 (a list of 86 lines reads no better)
    "H He Li Be B C N O F Ne Na Mg Al Si P S Cl Ar K Ca Sc Ti V Cr Mn Fe Co Ni Cu Zn Ga Ge As Se Br Kr "
    "Rb Sr Y Zr Nb Mo Tc Ru Rh Pd Ag Cd In Sn Sb Te I Xe Cs Ba La Ce Pr Nd Pm Sm Eu Gd Tb Dy Ho Er Tm Yb Lu "
    "Hf Ta W Re Os Ir Pt Au Hg Tl Pb Bi Po At Rn"
).split()
ATOMIC_NUMBER = {symbol: number for number, symbol in enumerate(SYMBOLS, start=1)}


def read_only(values: ArrayLike) -> NDArray[np.float64]:
    """A contiguous float copy that cannot be written to."""
    array = np.array(values, dtype=np.float64, order="C")
    array.setflags(write=False)
    return array


@dataclass(frozen=True, eq=False)
class Molecule:
    """Nuclei, charge and multiplicity."""

    elements: tuple[str, ...]
    """Element symbols, one per atom."""
    coordinates_bohr: NDArray[np.float64]
    """Shape (atoms, 3), bohr, read-only."""
    charge: int
    multiplicity: int
    """2S+1."""

    def __post_init__(self) -> None:
        coordinates = read_only(self.coordinates_bohr).reshape(-1, 3)
        coordinates.setflags(write=False)
        object.__setattr__(self, "coordinates_bohr", coordinates)
        unknown = sorted({e for e in self.elements if e not in ATOMIC_NUMBER})
        if unknown:
            raise StructureError(f"unknown element {', '.join(unknown)}")
        if len(self.elements) != len(coordinates):
            raise StructureError(f"{len(self.elements)} elements but {len(coordinates)} positions")

    @property
    def labels(self) -> tuple[str, ...]:
        """Element and 1-based place, such as C1 or H4."""
        return tuple(f"{element}{place}" for place, element in enumerate(self.elements, start=1))

    @property
    def atomic_numbers(self) -> tuple[int, ...]:
        return tuple(ATOMIC_NUMBER[element] for element in self.elements)

    @property
    def electrons(self) -> int:
        return sum(self.atomic_numbers) - self.charge

    @property
    def spin(self) -> float:
        """S."""
        return (self.multiplicity - 1) / 2

    @property
    def coordinates_angstrom(self) -> NDArray[np.float64]:
        return read_only(self.coordinates_bohr * BOHR_ANGSTROM)

    def moved(self, coordinates_bohr: ArrayLike) -> Molecule:
        """The same molecule with its nuclei elsewhere."""
        return replace(self, coordinates_bohr=np.asarray(coordinates_bohr, dtype=np.float64))

    def to_dict(self) -> dict[str, object]:
        """Plain data for JSON, coordinates in bohr at full precision."""
        return {
            "elements": list(self.elements),
            "coordinates_bohr": self.coordinates_bohr.tolist(),
            "charge": self.charge,
            "multiplicity": self.multiplicity,
        }
