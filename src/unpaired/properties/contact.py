"""Fermi contact: the spin density at the nuclei."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray


def spin_density_at_nuclei(
    spin_density_matrix: NDArray[np.float64], ao_at_nuclei: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Spin density at every nucleus, bohr^-3, shape (atoms,).

    rho(R_K) = sum_mn P_mn phi_m(R_K) phi_n(R_K) with P = P_alpha - P_beta for M_S = S, shape
    (basis functions, basis functions); `ao_at_nuclei` in bohr^-3/2, shape (atoms, basis functions).
    """
    return np.asarray(
        np.einsum("km,mn,kn->k", ao_at_nuclei, spin_density_matrix, ao_at_nuclei, optimize=True)
    )
