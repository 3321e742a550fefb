"""What each accuracy means: fitting set, grid, thresholds. Part of the key under which a state is stored."""

from __future__ import annotations

from dataclasses import asdict, dataclass

from ..errors import ChoiceError
from ..level import Level

ENGINE_VERSION = 3
"""Raised whenever the numbers of the engine change; a stored state of another version is never served."""


@dataclass(frozen=True)
class Settings:
    """Numerical settings of one accuracy."""

    fitting_set: str | None
    """Name of the density-fitting basis, see `auxiliary`; None computes exact integrals."""
    grid_level: int
    """Exchange-correlation grid of the final energy and density."""
    energy_tolerance_Eh: float
    gradient_tolerance: float
    start_grid_level: int | None = None
    """Coarser grid on which the density is converged first; None for none."""
    max_iterations: int = 100


SETTINGS = {
    "quick": Settings("def2-universal-jkfit", 1, 1e-7, 3e-5, 0),
    "standard": Settings("def2-universal-jkfit + free s, p", 1, 1e-9, 3e-6, 0),
    "reference": Settings(None, 4, 1e-10, 1e-6),
}

SCOUT = Settings("def2-universal-jkfit", 0, 1e-7, 1e-4)
"""For looking around in a small basis: which states there are, not their couplings."""


def settings(level: Level) -> Settings:
    """Settings of a level. Raises ChoiceError for an accuracy that does not exist."""
    try:
        return SETTINGS[level.accuracy]
    except KeyError:
        raise ChoiceError(
            f'accuracy "{level.accuracy}" does not exist (there are {", ".join(SETTINGS)})'
        ) from None


def identity(level: Level) -> dict[str, object]:
    """What, beside the Point, decides its numbers: for the store's key."""
    from importlib.metadata import version

    return {
        "engine_version": ENGINE_VERSION,
        "pyscf": version("pyscf"),
        "basis_set_exchange": version("basis_set_exchange"),
        "settings": asdict(settings(level)),
    }
