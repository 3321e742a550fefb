"""A Point: one molecule at one level. The unit of computing and of storing."""

from __future__ import annotations

import hashlib
import json
from dataclasses import dataclass

from .level import Level
from .molecule import Molecule


@dataclass(frozen=True)
class Solvent:
    """A continuum around the molecule."""

    name: str
    """As the recipe names it, or the number."""
    dielectric: float


@dataclass(frozen=True, eq=False)
class Point:
    """One molecule at one level, in vacuum or in a continuum."""

    molecule: Molecule
    level: Level
    solvent: Solvent | None = None

    def question(self) -> dict[str, object]:
        """Everything of the point that decides its numbers (names that decide nothing are left out)."""
        level = self.level.to_dict()
        del level["id"], level["name"]
        return {
            "molecule": self.molecule.to_dict(),
            "level": level,
            "dielectric": self.solvent.dielectric if self.solvent else None,
        }

    def key(self, engine: dict[str, object]) -> str:
        """SHA-256 of the question and of the engine that answers it, as 64 hexadecimal digits.

        `engine` comes from `electronic.identity`: versions, ENGINE_VERSION, settings of the accuracy.
        """
        text = json.dumps({"point": self.question(), "engine": engine}, sort_keys=True, allow_nan=False)
        return hashlib.sha256(text.encode()).hexdigest()
