"""A Geometry: what a structure file holds, before charge and multiplicity are known."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from ..errors import StructureError
from ..molecule import read_only


@dataclass(frozen=True, eq=False)
class Geometry:
    """Elements and positions."""

    elements: tuple[str, ...]
    coordinates_bohr: NDArray[np.float64]
    """Shape (atoms, 3), bohr, read-only."""
    comment: str = ""
    """What the file says about itself."""
    charge: int | None = None
    """Total formal charge, if the file states one (SDF); XYZ does not."""
    isotopes: Mapping[str, str] = field(default_factory=dict)
    """Isotopes that the file names, by atom label: {"H2": "2H"}."""

    def __post_init__(self) -> None:
        object.__setattr__(self, "coordinates_bohr", read_only(self.coordinates_bohr))


def structure_text(path: str | Path) -> str:
    """The text of a structure file. Raises StructureError if it cannot be read or is no text in UTF-8."""
    try:
        return Path(path).read_text(encoding="utf-8")
    except OSError as error:
        raise StructureError(f"{path}: cannot be read ({error.strerror or error})") from None
    except UnicodeDecodeError:
        raise StructureError(f"{path}: is not a text file in UTF-8") from None
