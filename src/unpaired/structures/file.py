"""One door for structure files: the suffix says which reader is meant."""

from __future__ import annotations

from pathlib import Path

from ..errors import StructureError
from .geometry import Geometry
from .xyz import read_xyz

SUFFIXES = (".xyz", ".sdf", ".mol")


def read_structure(path: str | Path) -> Geometry:
    """Read a structure from .xyz, .sdf or .mol.

    Raises StructureError with file and line.
    """
    place = Path(path)
    suffix = place.suffix.lower()
    if suffix not in SUFFIXES:
        raise StructureError(f'{place}: a structure file ends in {", ".join(SUFFIXES)}, found "{suffix}"')
    if suffix == ".xyz":
        return read_xyz(place)
    from .sdf import read_sdf

    return read_sdf(place)
