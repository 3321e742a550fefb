"""Errors cross process borders whole, and nearest() offers the spelling that was meant."""

from __future__ import annotations

import inspect
import pickle

import pytest

from unpaired import errors
from unpaired.errors import CalculationError, InputError, RecipeError, UnpairedError, nearest

CLASSES = [
    item
    for _, item in inspect.getmembers(errors, inspect.isclass)
    if issubclass(item, UnpairedError) and item.__module__ == errors.__name__
]


def test_the_tree_has_all_its_branches() -> None:
    assert {item.__name__ for item in CLASSES} == {
        *("UnpairedError", "InputError", "RecipeError", "StructureError", "ChoiceError", "RecordError"),
        *(
            "CalculationError",
            "ConvergenceError",
            "ResourceError",
            "WorkerError",
            "EngineError",
            "StoreError",
        ),
    }


@pytest.mark.parametrize("protocol", range(pickle.HIGHEST_PROTOCOL + 1))
@pytest.mark.parametrize("kind", CLASSES)
def test_every_error_survives_pickling(kind: type[UnpairedError], protocol: int) -> None:
    copy = pickle.loads(pickle.dumps(kind("what is wrong"), protocol=protocol))
    assert type(copy) is kind
    assert copy.message == str(copy) == "what is wrong"


def test_a_recipe_error_keeps_its_problems_when_pickled() -> None:
    error = RecipeError(problems=["a.yaml:1: x", "a.yaml:2: y"])
    copy = pickle.loads(pickle.dumps(error))
    assert copy.problems == ("a.yaml:1: x", "a.yaml:2: y")
    assert copy.message == "a.yaml:1: x\na.yaml:2: y"


def test_a_recipe_error_with_a_message_of_its_own_keeps_both() -> None:
    copy = pickle.loads(pickle.dumps(RecipeError("two problems", problems=["x", "y"])))
    assert (copy.message, copy.problems) == ("two problems", ("x", "y"))


@pytest.mark.parametrize("kind", CLASSES)
def test_every_error_has_a_tag_of_its_own_and_says_what_it_is(kind: type[UnpairedError]) -> None:
    assert [item for item in CLASSES if item.tag == kind.tag] == [kind]
    assert kind.__doc__


def test_what_the_user_can_do_splits_the_tree() -> None:
    assert not issubclass(InputError, CalculationError)
    assert not issubclass(errors.StoreError, InputError | CalculationError)


@pytest.mark.parametrize(
    ("wrong", "offer"),
    [("multiplicty", '; did you mean "multiplicity"?'), ("CHARGE", '; did you mean "charge"?'), ("zzz", "")],
)
def test_nearest_spelling(wrong: str, offer: str) -> None:
    assert nearest(wrong, ["charge", "multiplicity", "levels"]) == offer
