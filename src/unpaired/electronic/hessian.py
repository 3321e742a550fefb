"""Second derivatives of a surface: analytic where PySCF has them, differences of gradients elsewhere."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from .boundary import library_errors
from .surface import Surface
from .threads import suited_to

Floats = NDArray[np.float64]

STEP_BOHR = 0.01
"""Length of the displacement of a gradient difference (norm over all atoms)."""


def analytic_hessian(surface: Surface, coordinates_bohr: Floats) -> Floats | None:
    """Hessian (3 atoms, 3 atoms) in Eh/bohr^2, or None for methods that have no analytic one in PySCF.

    UHF and UKS have (also with fitting and in the continuum); ROHF, ROKS and functionals with a non-local
    correlation part have not.
    """
    if not surface.level.is_unrestricted:
        return None
    field = surface.converged(coordinates_bohr)
    if min(field.mol.nelec) == 0:  # PySCF's response fails on an empty spin
        return None
    with library_errors(f"{surface.level.id}, second derivatives"), suited_to(field.mol.nao):
        try:
            hessian = field.Hessian().set(verbose=0).kernel()
        except NotImplementedError:
            return None
    size = 3 * len(coordinates_bohr)
    return np.asarray(hessian.transpose(0, 2, 1, 3).reshape(size, size))


def difference_hessian(surface: Callable[[Floats], tuple[float, Floats]], coordinates_bohr: Floats) -> Floats:
    """Hessian (3 atoms, 3 atoms) in Eh/bohr^2 from central differences of gradients, 6 per atom."""
    product = hessian_product(surface, coordinates_bohr)
    rows = np.array([product(direction) for direction in np.eye(coordinates_bohr.size)])
    return np.asarray((rows + rows.T) / 2)


def forward_hessian(surface: Callable[[Floats], tuple[float, Floats]], coordinates_bohr: Floats) -> Floats:
    """A rough Hessian (3 atoms, 3 atoms) in Eh/bohr^2 from one displaced gradient per coordinate."""
    product = forward_product(surface, coordinates_bohr)
    rows = np.array([product(direction) for direction in np.eye(coordinates_bohr.size)])
    return np.asarray((rows + rows.T) / 2)


def forward_product(
    surface: Callable[[Floats], tuple[float, Floats]], coordinates_bohr: Floats
) -> Callable[[Floats], Floats]:
    """As `hessian_product` at half its price; stiff curvatures are off by about a hundredth, soft ones by less."""
    here = surface(coordinates_bohr)[1]

    def product(direction: Floats) -> Floats:
        ahead = surface(coordinates_bohr + STEP_BOHR * direction.reshape(-1, 3))[1]
        return np.asarray((ahead - here).ravel() / STEP_BOHR)

    return product


def hessian_product(
    surface: Callable[[Floats], tuple[float, Floats]], coordinates_bohr: Floats
) -> Callable[[Floats], Floats]:
    """The Hessian times a direction (3 atoms,), from the gradients on both sides."""

    def product(direction: Floats) -> Floats:
        shift = STEP_BOHR * direction.reshape(-1, 3)
        ahead = surface(coordinates_bohr + shift)[1]
        behind = surface(coordinates_bohr - shift)[1]
        return np.asarray((ahead - behind).ravel() / (2 * STEP_BOHR))

    return product
