"""What a finished electronic-structure calculation leaves: plain arrays, no library objects."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Plain = str | float | int | bool | None


@dataclass(frozen=True, eq=False)
class Solution:
    """One stationary electronic state of one point."""

    energy_Eh: float
    s_squared: float
    stable: bool | None
    """Internal stability; None is not known."""
    label: str
    """Symmetry of the open shell where there is one, else spin populations."""
    origin: str
    """The start it was reached from."""
    orbitals: NDArray[np.float64]
    """Shape (2, basis functions, orbitals): alpha, beta. Equal for restricted-open levels."""
    occupations: NDArray[np.float64]
    """Shape (2, orbitals), 0 or 1."""
    orbital_energies_Eh: NDArray[np.float64]
    """Shape (2, orbitals)."""

    @property
    def density_matrices(self) -> NDArray[np.float64]:
        """Alpha and beta, shape (2, basis functions, basis functions)."""
        occupied = self.orbitals * self.occupations[:, None, :]
        return np.asarray(occupied @ self.orbitals.transpose(0, 2, 1))

    @property
    def spin_density_matrix(self) -> NDArray[np.float64]:
        """Alpha minus beta for M_S = S, shape (basis functions, basis functions)."""
        alpha, beta = self.density_matrices
        return np.asarray(alpha - beta)


@dataclass(frozen=True, eq=False)
class State:
    """The answer to a Point: every solution found, lowest first, and which one was taken."""

    solutions: tuple[Solution, ...]
    taken: int
    """Index into `solutions`."""
    overlap: NDArray[np.float64]
    """Shape (basis functions, basis functions)."""
    ao_at_nuclei: NDArray[np.float64]
    """Basis functions at the nuclei, bohr^-3/2, shape (atoms, basis functions)."""
    iterations: int
    """SCF iterations in the final basis, all starts together."""
    wall_s: float
    story: tuple[str, ...] = ()
    """What convergence and stability needed, one sentence each."""
    engine: dict[str, Plain] = field(default_factory=dict)
    """Settings as used: functional as libxc has it, fitting set, grid, thresholds, versions."""

    @property
    def solution(self) -> Solution:
        return self.solutions[self.taken]

    @property
    def energy_Eh(self) -> float:
        return self.solution.energy_Eh

    @property
    def s_squared(self) -> float:
        return self.solution.s_squared

    @property
    def stable(self) -> bool | None:
        return self.solution.stable

    @property
    def basis_functions(self) -> int:
        return int(self.overlap.shape[0])


@dataclass(frozen=True)
class Failure:
    """A point that gave no state, with its reason."""

    code: str
    """The `tag` of the error class."""
    message: str
    advice: str = ""
