"""The exceptions of `unpaired`, one tree, split by what the user can do about them.

    UnpairedError
      InputError              the question was wrong: exit status 2, nothing runs
        RecipeError           a recipe; carries every problem found, each with file and line
        StructureError        a structure: file, line, atom
        ChoiceError           a name that does not exist (basis set, functional, solvent, isotope, level)
        RecordError           a file that this program reads back does not hold what it should
      CalculationError        one level failed: it becomes a row with its reason, the others go on
        ConvergenceError      no stationary electronic state was found
        ResourceError         memory or disk did not suffice
        WorkerError           the process that computed it died
        EngineError           anything else that the electronic-structure library raised
      StoreError              the results folder cannot be read or written

Every class takes its message as the only positional argument, so that it survives pickling between processes.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence


class UnpairedError(Exception):
    """Base of every error that `unpaired` raises on purpose."""

    tag = "error"

    def __init__(self, message: str = "") -> None:
        super().__init__(message)
        self.message = message


class InputError(UnpairedError):
    """The input was refused; nothing has run."""

    tag = "input"


class RecipeError(InputError):
    """A recipe was refused. `problems` holds one sentence per problem, each starting with file:line."""

    tag = "recipe"

    def __init__(self, message: str = "", *, problems: Iterable[str] = ()) -> None:
        self.problems = tuple(problems)
        super().__init__(message or "\n".join(self.problems))

    def __reduce__(self) -> tuple[object, ...]:
        return (_rebuild_recipe_error, (self.message, self.problems))


def _rebuild_recipe_error(message: str, problems: tuple[str, ...]) -> RecipeError:
    return RecipeError(message, problems=problems)


class StructureError(InputError):
    """A structure cannot be used."""

    tag = "structure"


class ChoiceError(InputError):
    """A basis set, functional, solvent, isotope or level that does not exist or does not fit."""

    tag = "choice"


class RecordError(InputError):
    """A file that should hold a result of this program does not."""

    tag = "record"


class CalculationError(UnpairedError):
    """One level failed; the reason becomes a row of the result."""

    tag = "failed"


class ConvergenceError(CalculationError):
    """The self-consistent field found no stationary state."""

    tag = "not-converged"


class ResourceError(CalculationError):
    """Memory or disk did not suffice."""

    tag = "out-of-resources"


class WorkerError(CalculationError):
    """The process that computed this level died."""

    tag = "worker-died"


class EngineError(CalculationError):
    """The electronic-structure library raised something that has no better name."""

    tag = "engine"


class StoreError(UnpairedError):
    """The results folder cannot be read or written."""

    tag = "store"


def nearest(wrong: str, allowed: Iterable[str]) -> str:
    """`; did you mean "..."?` for the closest allowed spelling, or an empty string."""
    known = {item.casefold(): item for item in allowed}
    found = difflib.get_close_matches(wrong.casefold(), known, n=1, cutoff=0.6)
    return f'; did you mean "{known[found[0]]}"?' if found else ""


def require_choice(option: str, value: str, allowed: Sequence[str]) -> None:
    """Raise ChoiceError, naming the nearest spelling and all that is allowed, unless `value` is one of them."""
    if value not in allowed:
        raise ChoiceError(
            f'{option}: "{value}" does not exist{nearest(value, allowed)} (there are {", ".join(allowed)})'
        )
