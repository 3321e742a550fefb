"""The public Python interface is what `__all__` says, and costs nothing until it is used."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import unpaired


@pytest.mark.parametrize("name", unpaired.__all__)
def test_every_public_name_exists_and_is_documented(name: str) -> None:
    assert getattr(unpaired, name).__doc__
    assert name in dir(unpaired)


def test_public_names_are_sorted() -> None:
    assert unpaired.__all__ == sorted(unpaired.__all__)


def test_type_checkers_see_the_same_names() -> None:
    tree = ast.parse(Path(unpaired.__file__).read_text(encoding="utf-8"))
    block = next(node for node in tree.body if isinstance(node, ast.If))
    seen = [alias.name for node in block.body if isinstance(node, ast.ImportFrom) for alias in node.names]
    assert sorted(seen) == unpaired.__all__


def test_a_name_that_does_not_exist_is_an_attribute_error() -> None:
    with pytest.raises(AttributeError, match="no attribute 'couplings'"):
        unpaired.couplings  # noqa: B018


def _python(code: str) -> str:
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    return run.stdout.strip()


def test_importing_the_package_loads_no_library() -> None:
    heavy = "{'numpy', 'scipy', 'pandas', 'pyscf', 'matplotlib', 'rdkit', 'typer'}"
    assert _python(f"import sys, unpaired; print({heavy} & set(sys.modules))") == "set()"


def test_the_module_of_that_name_does_not_hide_the_function() -> None:
    assert (
        _python("from unpaired.study import plan; import unpaired; print(callable(unpaired.study))") == "True"
    )
