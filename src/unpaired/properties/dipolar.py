"""Dipolar (anisotropic) hyperfine tensors."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ..constants import DIPOLAR_MHZ

Array = NDArray[np.float64]

COMPONENTS = {"xx": (0, 0), "yy": (1, 1), "zz": (2, 2), "xy": (0, 1), "xz": (0, 2), "yz": (1, 2)}
"""The six components by name, in the order of the table."""


def dipolar_tensor_MHz(field_gradient: Array, nuclear_g: float, multiplicity: int) -> Array:
    """Dipolar tensor of one nucleus in MHz, shape (3, 3), traceless, first order and non-relativistic.

    T_ij = DIPOLAR_MHZ g_N/(2S) F_ij; F_ij = sum_mn P_mn <m|(3 r_i r_j - delta_ij r^2)/r^5|n> in bohr^-3 for
    M_S = S, as `electronic.integrals.field_gradients` gives it.
    """
    return np.asarray(DIPOLAR_MHZ * nuclear_g / (multiplicity - 1) * field_gradient)


def principal(tensor: Array) -> tuple[Array, Array]:
    """Principal values, ascending, and axes as rows of a right-handed frame, shape (3, 3).

    The sign of an axis means nothing; it is chosen so that its largest component is positive (of the third:
    that the frame is right-handed).
    """
    values, columns = np.linalg.eigh(tensor)
    axes = columns.T
    for axis in axes:
        axis *= np.sign(axis[np.argmax(np.abs(axis))])
    axes[2] = np.cross(axes[0], axes[1])
    return values, axes
