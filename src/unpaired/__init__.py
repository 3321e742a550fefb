"""Hyperfine couplings of radicals: predicted, judged and put into tables.

    from unpaired import couplings_table, load_recipe, study
    table = couplings_table([study(load_recipe("methyl.yaml"))])

The names below are the public ones. Each is loaded when it is first used, because the libraries behind some of
them take longer to import than `unpaired --help` may.
"""

from __future__ import annotations

import os
import sys
from importlib import import_module
from types import ModuleType
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from .electronic.solve import solve
    from .errors import (
        CalculationError,
        ChoiceError,
        InputError,
        RecipeError,
        RecordError,
        StoreError,
        StructureError,
        UnpairedError,
    )
    from .flag import Flag
    from .level import Level
    from .molecule import Molecule
    from .nuclei import Isotope, isotope
    from .point import Point, Solvent
    from .recipe import Recipe, load_recipe
    from .result import Result, load_result
    from .state import State
    from .study import study
    from .tables import couplings_table, flags_table, states_table

# OpenMP reads this once, when the first library that uses it is loaded. Its threads would otherwise wait in busy
# loops and take the cores from NumPy's (measured in electronic/threads.py).
os.environ.setdefault("OMP_WAIT_POLICY", "PASSIVE")

__all__ = [
    "CalculationError",
    "ChoiceError",
    "Flag",
    "InputError",
    "Isotope",
    "Level",
    "Molecule",
    "Point",
    "Recipe",
    "RecipeError",
    "RecordError",
    "Result",
    "Solvent",
    "State",
    "StoreError",
    "StructureError",
    "UnpairedError",
    "couplings_table",
    "flags_table",
    "isotope",
    "load_recipe",
    "load_result",
    "solve",
    "states_table",
    "study",
]

_NAMES_IN = {
    "electronic.solve": "solve",
    "errors": (
        "CalculationError ChoiceError InputError RecipeError RecordError StoreError StructureError UnpairedError"
    ),
    "flag": "Flag",
    "level": "Level",
    "molecule": "Molecule",
    "nuclei": "Isotope isotope",
    "point": "Point Solvent",
    "recipe": "Recipe load_recipe",
    "result": "Result load_result",
    "state": "State",
    "study": "study",
    "tables": "couplings_table flags_table states_table",
}
_HOME = {name: module for module, names in _NAMES_IN.items() for name in names.split()}


class _Package(ModuleType):
    """Keeps a module from hiding the public function of the same name: Python sets `study` on import of study.py."""

    def __setattr__(self, name: str, value: object) -> None:
        if not (name in _HOME and isinstance(value, ModuleType)):
            super().__setattr__(name, value)


sys.modules[__name__].__class__ = _Package


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    value = getattr(import_module(f".{_HOME[name]}", __name__), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
