"""Data flows one way: every module imports only from lines above its own; PySCF stays at its edge."""

from __future__ import annotations

import ast
from graphlib import TopologicalSorter
from pathlib import Path

import unpaired

SOURCE = Path(unpaired.__file__).parent

MAP = """
errors constants columns version flag
files machine minimal tight
molecule level
point state settled
nuclei catalogue
structures
recipe
electronic
properties
motion
diagnostics basis_errors ensemble
proof
settle
result
origin solutions analysis
store
execute
study
layout report tables
spinsystem
spectrum contrast
"""
"""From the bottom up. A package counts as one line; a module that is not here belongs above all of these."""

TOP = ("cli", "__main__")
RANK = {name: rank for rank, line in enumerate(MAP.strip().splitlines()) for name in line.split()}
MIDDLE = len(MAP.splitlines())
MAY_IMPORT_PYSCF = ("electronic", "catalogue")


def _modules() -> dict[str, ast.Module]:
    """Every module of the package except the lazy front door, by dotted name without `unpaired.`."""
    found = {}
    for path in SOURCE.rglob("*.py"):
        parts = path.relative_to(SOURCE).with_suffix("").parts
        name = ".".join(parts[:-1] if parts[-1] == "__init__" else parts)
        if name:
            found[name] = ast.parse(path.read_text(encoding="utf-8"))
    return found


MODULES = _modules()


def _imports(name: str) -> set[str]:
    """Modules of the package that a module imports, wherever in it the import stands."""
    package = (
        name.split(".")
        if (SOURCE / Path(*name.split(".")) / "__init__.py").exists()
        else name.split(".")[:-1]
    )
    found = set()
    for node in ast.walk(MODULES[name]):
        if isinstance(node, ast.ImportFrom):
            if node.level:
                base = [*package[: len(package) - node.level + 1], *(node.module or "").split(".")]
            elif (node.module or "").split(".")[0] == "unpaired":
                base = (node.module or "").split(".")[1:]
            else:
                continue
            start = ".".join(filter(None, base))
            for alias in node.names:
                whole = f"{start}.{alias.name}".lstrip(".")
                found.add(whole if whole in MODULES else start)
    return found - {name, ""}


def _rank(name: str) -> int:
    top = name.split(".")[0]
    return MIDDLE + 1 if top in TOP else RANK.get(top, MIDDLE)


def test_imports_go_downwards_only() -> None:
    wrong = [
        f"{name} imports {other}"
        for name in MODULES
        for other in _imports(name)
        if name.split(".")[0] != other.split(".")[0] and _rank(other) > _rank(name)
    ]
    assert wrong == []


def test_there_is_no_import_cycle() -> None:
    tuple(TopologicalSorter({name: _imports(name) for name in MODULES}).static_order())


def _libraries(name: str) -> set[str]:
    found = set()
    for node in ast.walk(MODULES[name]):
        if isinstance(node, ast.Import):
            found |= {alias.name.split(".")[0] for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and not node.level:
            found.add((node.module or "").split(".")[0])
    return found


def test_only_the_engine_and_the_catalogue_import_pyscf() -> None:
    users = {name.split(".")[0] for name in MODULES if "pyscf" in _libraries(name)}
    assert users == set(MAY_IMPORT_PYSCF)


def test_properties_are_plain_functions_over_arrays() -> None:
    used = set().union(*(_libraries(name) for name in MODULES if name.startswith("properties.")))
    assert not used & {"pyscf", "pandas", "rdkit", "matplotlib", "typer"}


def test_commands_do_no_science() -> None:
    used = set().union(*(_libraries(name) for name in MODULES if name.startswith("cli")))
    assert not used & {"pyscf", "scipy", "rdkit"}


def test_the_map_names_only_modules_that_are_there() -> None:
    there = {name.split(".")[0] for name in MODULES}
    assert set(RANK) - there <= {"motion"}  # to come
