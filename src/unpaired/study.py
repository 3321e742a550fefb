"""The chain for one recipe: settle the structure, list the points, solve, take properties, write the record."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import partial
from typing import Any

from . import analysis, columns, diagnostics, solutions
from .ensemble import averaged_mT, conformer_rows
from .execute import Outcome, Solve, attempt
from .flag import Flag, join_codes, worst
from .level import Level
from .molecule import Molecule
from .nuclei import table_isotope
from .point import Point
from .recipe.recipe import Recipe
from .result import Result, Row
from .settle import settle, unsettled
from .settled import Settled
from .state import Failure
from .structures.groups import Group, find_groups

MapLike = Callable[[Callable[[Point], Outcome], Iterable[Point]], Iterable[Outcome]]


@dataclass(frozen=True, eq=False)
class Plan:
    """A recipe whose structure is settled: what will be asked of the engine, and of which nuclei."""

    recipe: Recipe
    molecule: Molecule
    structure_note: str
    points: tuple[Point, ...]
    """One per level, in recipe order."""
    isotopes: tuple[str | None, ...]
    """Isotope per atom; None for an element without a tabulated magnetic isotope."""
    groups: tuple[Group, ...]
    settled: Settled
    others: tuple[Point, ...] = ()
    """The same levels at every further conformer, conformer by conformer."""

    @property
    def every_point(self) -> tuple[Point, ...]:
        """All that is asked of the engine: `points`, then `others`."""
        return self.points + self.others


def plan(recipe: Recipe, settled: Settled | None = None) -> Plan:
    """List the points of a settled recipe; without one, of the structure before it is relaxed.

    Raises InputError if the structure cannot be used.
    """
    if settled is None:
        settled = unsettled(recipe)
    molecule = settled.molecule
    isotopes = isotopes_of(molecule, recipe.isotopes)
    return Plan(
        recipe=recipe,
        molecule=molecule,
        structure_note=settled.note,
        points=tuple(Point(molecule, level, recipe.solvent) for level in recipe.levels),
        settled=settled,
        others=tuple(
            Point(conformer.molecule, level, recipe.solvent)
            for conformer in settled.conformers[1:]
            for level in recipe.levels
        ),
        isotopes=isotopes,
        groups=find_groups(molecule, isotopes, recipe.groups),
    )


def isotopes_of(molecule: Molecule, named: Mapping[str, str]) -> tuple[str | None, ...]:
    """The isotope of every atom: the one that the recipe names, else the most abundant with a spin."""
    found: list[str | None] = []
    for label, element in zip(molecule.labels, molecule.elements, strict=True):
        usual = table_isotope(element)
        found.append(named.get(label, usual.name if usual else None))
    return tuple(found)


def study(recipe: Recipe, solve: Solve | None = None, execute: MapLike = map) -> Result:
    """Run every level of a recipe and return its record.

    `solve(point, report)` is the engine (default: `electronic.solve.solve`); `execute` is any map-like
    callable. A level that fails is a row with its reason. Raises InputError for a recipe that cannot run.
    """
    if solve is None:
        from .electronic.solve import solve as engine

        solve = engine
    planned = plan(recipe, settle(recipe))
    return assemble(planned, list(execute(partial(attempt, solve), planned.every_point)))


def assemble(planned: Plan, outcomes: Sequence[Outcome]) -> Result:
    """The record from the outcomes of every point of a plan, in their order."""
    tables: dict[str, list[dict[str, Any]]] = {name: [] for name in columns.TABLES}
    details: dict[str, Any] = {}
    settled = planned.settled
    flags: list[Flag] = list(settled.flags)
    if len(outcomes) != len(planned.every_point):
        raise ValueError(f"{len(outcomes)} outcomes for {len(planned.every_point)} points")
    for place, (point, outcome) in enumerate(zip(planned.points, outcomes, strict=False)):
        if isinstance(outcome, Failure):
            part = _failed(planned, point, outcome)
        else:
            part = analysis.analyse(point, outcome, planned.groups, planned.isotopes)
        details[point.level.id] = part.details
        for row in part.tables["states"]:
            row |= {"minimum": settled.minimum, "lowest_mode_cm": settled.lowest_mode_cm}
        _add_conformers(
            part,
            planned,
            planned.every_point[place :: len(planned.points)],
            outcomes[place :: len(planned.points)],
        )
        flags += part.flags
        for name, rows in part.tables.items():
            tables[name] += [_common(planned, point.level, name) | row for row in rows]
    flags += analysis.across_levels(planned.points, outcomes[: len(planned.points)])
    _attach(tables, flags)
    tables["flags"] = [flag.row(planned.recipe.radical) for flag in flags]
    return Result(
        radical=planned.recipe.radical,
        recipe=planned.recipe.to_dict(),
        molecule=planned.molecule,
        tables={name: tuple(_ordered(name, row) for row in rows) for name, rows in tables.items()},
        details=details,
        provenance=provenance() | _how_settled(settled),
        structure_note=planned.structure_note,
    )


def provenance() -> dict[str, Any]:
    """Versions and editions that the numbers rest on; no user or host names."""
    from importlib.metadata import version

    from .constants import CODATA_EDITION
    from .nuclei import ISOTOPE_EDITION
    from .version import VERSION

    packages = ("pyscf", "basis-set-exchange", "numpy", "scipy")
    return {
        "packages": {"unpaired": VERSION} | {name: version(name) for name in packages},
        "constants": CODATA_EDITION,
        "isotopes": ISOTOPE_EDITION,
    }


def _how_settled(settled: Settled) -> dict[str, Any]:
    """What the record keeps of the settling, nothing for a structure that was taken as it is."""
    if not settled.conformers:
        return {}
    return {
        "structure": {
            "story": list(settled.story),
            "wall_s": dict(settled.seconds),
            "weights_with_zero_point_energy": settled.with_zero_point,
            "conformers": [conformer.molecule.to_dict() for conformer in settled.conformers],
        }
    }


def _add_conformers(
    part: analysis.Part, planned: Plan, points: Sequence[Point], outcomes: Sequence[Outcome]
) -> None:
    """Rows per conformer and the thermal means, where there are several conformers."""
    settled = planned.settled
    if len(settled.conformers) < 2:
        return
    part.tables["conformers"] = conformer_rows(settled, outcomes, planned.isotopes)
    part.flags += _conformer_flags(points[1:], outcomes[1:])
    means = averaged_mT(settled, outcomes, planned.isotopes, planned.groups)
    if means is not None:
        for row, mean in zip(part.tables["couplings"], means, strict=True):
            row["a_averaged_mT"] = mean


def _conformer_flags(points: Sequence[Point], outcomes: Sequence[Outcome]) -> list[Flag]:
    """Doubtful states among the conformers beyond the first, whose couplings enter the averages."""
    flags = []
    for number, (point, outcome) in enumerate(zip(points, outcomes, strict=True), start=2):
        if isinstance(outcome, Failure):
            advice = f"conformer {number} has no couplings ({outcome.message}): there is no average over conformers"
            flags.append(Flag("conformer-failed", "caution", advice, level=point.level.id))
            continue
        found = [*diagnostics.contamination_flags(outcome, point), *solutions.state_flags(point, outcome)]
        found = [flag for flag in found if flag.severity != "note"]
        if found:
            advice = f"conformer {number}, which enters the averages: {join_codes(found)}"
            flags.append(Flag("conformer-doubtful", worst(found), advice, level=point.level.id))
    return flags


def _failed(planned: Plan, point: Point, outcome: Failure) -> analysis.Part:
    """Rows with empty numbers and the reason as a flag."""
    advice = f"{outcome.message}; {outcome.advice}" if outcome.advice else outcome.message
    atoms = analysis.atom_rows(point.molecule, planned.groups, planned.isotopes)
    spin = point.molecule.spin
    return analysis.Part(
        tables={"couplings": atoms, "states": [{"converged": False, "s_squared_exact": spin * (spin + 1)}]},
        flags=[Flag(outcome.code, "bad", advice, level=point.level.id)],
        details={"failure": {"code": outcome.code, "message": outcome.message, "advice": outcome.advice}},
    )


def _common(planned: Plan, level: Level, table: str) -> dict[str, Any]:
    """The columns that name radical and level, those of them that the table has."""
    every = {
        "radical": planned.recipe.radical,
        "level": level.id,
        "scf": level.scf,
        "functional": level.functional,
        "basis": level.basis,
    }
    return {name: value for name, value in every.items() if name in columns.names(table)}


def _attach(tables: dict[str, list[dict[str, Any]]], flags: Sequence[Flag]) -> None:
    """Put the codes beside the numbers: a level's flags on all its rows, an atom's on that atom's."""
    for name in ("couplings", "states"):
        for row in tables[name]:
            here = [
                flag
                for flag in flags
                if flag.level in (None, row["level"])
                and (name == "states" or flag.atom in (None, row["atom"]))
            ]
            row["flags"] = join_codes(here)


def _ordered(table: str, row: Row) -> Row:
    """The row with every column of its table, in file order, missing ones None."""
    unknown = set(row) - set(columns.names(table))
    if unknown:
        raise KeyError(f"column {', '.join(sorted(unknown))} of table {table} is not in the registry")
    return {name: row.get(name) for name in columns.names(table)}
