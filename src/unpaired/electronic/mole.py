"""A Point as PySCF's molecule, in bohr and with the catalogue's basis functions."""

from __future__ import annotations

from typing import Any

from .. import catalogue
from ..point import Point


def build_mole(point: Point) -> Any:
    """PySCF Mole of a point: spherical basis functions, no symmetry, silent.

    Coordinates are handed over in bohr, because PySCF's own conversion uses another CODATA edition.
    """
    from pyscf import gto

    molecule, basis = point.molecule, point.level.basis
    mole = gto.Mole()
    mole.unit = "Bohr"
    mole.atom = list(zip(molecule.elements, molecule.coordinates_bohr.tolist(), strict=True))
    mole.basis = {element: catalogue.basis_for(basis, element) for element in set(molecule.elements)}
    mole.charge = molecule.charge
    mole.spin = molecule.multiplicity - 1
    mole.cart = False
    mole.symmetry = False
    mole.verbose = 0
    mole.build(dump_input=False, parse_arg=False)
    return mole
