"""A level of theory: method, functional, basis set, accuracy."""

from __future__ import annotations

from dataclasses import dataclass

METHODS = ("UHF", "ROHF", "UKS", "ROKS")
KOHN_SHAM = ("UKS", "ROKS")
RESTRICTED_OPEN = ("ROHF", "ROKS")
ACCURACIES = ("quick", "standard", "reference")


@dataclass(frozen=True)
class Level:
    """One level of a recipe. Names are spelled canonically by the time a Level exists."""

    scf: str
    """UHF, ROHF, UKS or ROKS."""
    basis: str
    functional: str | None = None
    """A functional of libxc for UKS and ROKS, None otherwise."""
    accuracy: str = "standard"
    """quick, standard or reference."""
    name: str | None = None
    """The user's own name for the level, if any."""
    solution: int | str | None = None
    """Which of the stable solutions found is asked for: 1-based place by energy, or a state label; None is the lowest."""

    @property
    def id(self) -> str:
        """`UHF/pcH-1`, `UKS-B3LYP/pcH-1`, or the user's name."""
        if self.name is not None:
            return self.name
        return f"{self.method}/{self.basis}"

    @property
    def method(self) -> str:
        """`UHF` or `UKS-B3LYP`."""
        return f"{self.scf}-{self.functional}" if self.functional else self.scf

    @property
    def is_kohn_sham(self) -> bool:
        return self.scf in KOHN_SHAM

    @property
    def is_unrestricted(self) -> bool:
        return self.scf not in RESTRICTED_OPEN

    def to_dict(self) -> dict[str, object]:
        """Plain data for JSON."""
        return {
            "id": self.id,
            "scf": self.scf,
            "functional": self.functional,
            "basis": self.basis,
            "accuracy": self.accuracy,
            "name": self.name,
            "solution": self.solution,
        }
