"""Whatever the library raises becomes one of our errors, with its reason, and nothing else is swallowed."""

import numpy as np
import pytest

from unpaired.electronic import solutions
from unpaired.electronic import solve as solving
from unpaired.electronic.boundary import library_errors
from unpaired.errors import CalculationError, ChoiceError, ConvergenceError, EngineError, ResourceError
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point


@pytest.mark.parametrize(
    ("raised", "expected"),
    [
        (MemoryError(), ResourceError),
        (OSError(28, "No space left on device"), ResourceError),
        (np.linalg.LinAlgError("singular matrix"), EngineError),
        (NotImplementedError("ROHF Fock-damping"), EngineError),
        (RuntimeError("Electron number 8 and spin 1 are not consistent"), EngineError),
        (FloatingPointError("overflow"), EngineError),
        (KeyError("H"), EngineError),
        (ValueError("array must not contain infs or NaNs"), EngineError),
        (ZeroDivisionError("float division by zero"), EngineError),
        (AssertionError(), EngineError),
        (UserWarning("odd"), EngineError),
    ],
)
def test_a_failure_of_the_library_is_mapped_and_keeps_its_words(raised, expected):
    with pytest.raises(expected) as caught, library_errors("UHF/pcH-1"):
        raise raised
    assert isinstance(caught.value, CalculationError)
    assert caught.value.message.startswith("UHF/pcH-1: ")
    assert "\n" not in caught.value.message
    assert caught.value.__cause__ is raised
    words = getattr(raised, "strerror", None) or (str(raised.args[0]) if raised.args else "")
    assert words in caught.value.message


@pytest.mark.parametrize("passing", [KeyboardInterrupt(), SystemExit(3)])
def test_an_interruption_passes(passing):
    with pytest.raises(type(passing)), library_errors("UHF/pcH-1"):
        raise passing


def test_our_own_errors_pass_unchanged():
    own = ChoiceError("no such basis set")
    with pytest.raises(ChoiceError) as caught, library_errors("UHF/pcH-1"):
        raise own
    assert caught.value is own


def hydrogen_molecule_ion(distance_bohr: float = 2.0, scf: str = "UHF") -> Point:
    return Point(Molecule(("H", "H"), [[0, 0, 0], [0, 0, distance_bohr]], 1, 2), Level(scf, "pcH-1"))


def test_nuclei_at_one_place_are_an_error_with_a_reason():
    with pytest.raises(CalculationError, match="UHF/pcH-1"):
        solving.solve(hydrogen_molecule_ion(0.0))


def test_an_interruption_in_the_middle_of_a_calculation_passes():
    def interrupt(stage: str, iteration: int, energy_Eh: float) -> None:
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        solving.solve(hydrogen_molecule_ion(), interrupt)


def test_what_does_not_converge_is_an_error_and_says_what_was_tried(monkeypatch):
    def stuck(field, density):
        field.e_tot, field.converged = -1.0, False
        return ("extrapolation (DIIS)", "second order")

    monkeypatch.setattr(solutions, "converge", stuck)
    with pytest.raises(ConvergenceError, match="second order"):
        solving.solve(hydrogen_molecule_ion())
