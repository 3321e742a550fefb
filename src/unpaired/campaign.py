"""Many recipes in one go: everything is validated first, points run side by side, results are written as they end."""

from __future__ import annotations

import functools
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Protocol

from . import machine
from .errors import CalculationError, InputError, StoreError
from .execute import ADVICE, Here, Outcome, Pool, Solve, StoredSolve, Submitter, attempt, failure, run_points
from .files import require_writable
from .forecast import require_memory
from .point import Point
from .recipe.load import load_recipes
from .report import full_report
from .result import Result
from .settle import settle
from .state import Failure, State
from .store import Store
from .study import Plan, assemble, plan
from .tables import write_result


class Watcher(Protocol):
    """Where progress goes."""

    def show(self, text: str) -> None:
        """What is being done now."""

    def say(self, text: str) -> None:
        """A sentence that must not be lost."""


class Campaign:
    """The recipes of one command, run against one results folder."""

    def __init__(
        self,
        recipes: Sequence[Path],
        out: Path,
        workers: int,
        watcher: Watcher,
        solve: Solve | None = None,
        executor: Submitter | None = None,
    ) -> None:
        """Validate everything. Raises InputError (all problems of all recipes) before anything runs."""
        from .electronic.settings import identity

        self.out = out
        self.workers = workers
        self.watcher = watcher
        self.recipes = load_recipes(recipes)
        try:
            require_writable(out)
        except StoreError as error:
            raise InputError(error.message) from None
        self.plans = [plan(recipe) for recipe in self.recipes]
        self.store = Store(out, identity, say=_say)
        require_memory(self.plans, finished=self.store.has)
        self.solve = StoredSolve(solve or _engine, self.store)
        self.executor = executor

    def run(self, print_result: Callable[[str], None]) -> str:
        """Run, print and write every recipe. Returns what failed and what to do, empty if nothing did.

        On KeyboardInterrupt the finished levels are written and the interrupt goes on.
        """
        failures: list[str] = []
        plans = self._settled(failures, print_result)
        places = [
            (which, place) for which, planned in enumerate(plans) for place in range(len(planned.every_point))
        ]
        outcomes: list[dict[int, Outcome]] = [{} for _ in plans]

        def done(place: int, outcome: Outcome) -> None:
            which, level = places[place]
            outcomes[which][level] = outcome
            self.watcher.show(f"{sum(map(len, outcomes))} of {len(places)} levels done")
            if len(outcomes[which]) == len(plans[which].every_point):
                failures.extend(self._finish(plans[which], outcomes[which], print_result))

        points = [plans[which].every_point[level] for which, level in places]
        try:
            self._run_points(points, [plans[which].recipe.radical for which, _ in places], done)
        except KeyboardInterrupt:
            for planned, found in zip(plans, outcomes, strict=True):
                if found and len(found) < len(planned.every_point):
                    self._finish(planned, found, print_result)
            raise
        return "\n".join(failures)

    def _settled(self, failures: list[str], print_result: Callable[[str], None]) -> list[Plan]:
        """Plans at settled structures; where one cannot be settled, every level is a row with the reason."""
        plans = []
        for before in self.plans:
            recipe = before.recipe
            try:
                plans.append(plan(recipe, settle(recipe, self._walking(recipe.radical), self.store.folder)))
            except CalculationError as error:
                reason = failure(error)
                found: dict[int, Outcome] = dict.fromkeys(range(len(before.every_point)), reason)
                failures += self._finish(before, found, print_result)
        return plans

    def _walking(self, radical: str) -> Callable[[str, int, float, float], None]:
        """Progress of a relaxation."""

        def report(stage: str, step: int, energy_Eh: float, gradient: float) -> None:
            self.watcher.show(f"{radical}  {stage}  step {step}  {energy_Eh:.6f} Eh  gradient {gradient:.1e}")

        return report

    def _run_points(
        self, points: Sequence[Point], names: Sequence[str], done: Callable[[int, Outcome], None]
    ) -> None:
        name_of = {id(point): name for point, name in zip(points, names, strict=True)}
        if self.executor is None and self.workers == 1:

            def call(point: Point) -> Outcome:
                title = f"{name_of[id(point)]}  {point.level.id}"

                def report(stage: str, iteration: int, energy_Eh: float) -> None:
                    self.watcher.show(f"{title}  {stage}  iteration {iteration}  {energy_Eh:.6f} Eh")

                self.watcher.show(title)
                return attempt(self.solve, point, report)

            run_points(points, call, Here(), done)
            return
        from .electronic.cost import estimate

        pool = None if self.executor else Pool(self.workers, max(1, machine.cores() // self.workers))
        try:
            run_points(
                points,
                functools.partial(attempt, self.solve),
                self.executor or pool,  # type: ignore[arg-type]
                done,
                at_once=self.workers,
                memory_of=lambda point: estimate(point).memory_bytes,
                memory_limit_bytes=machine.memory_bytes(),
            )
        finally:
            if pool is not None:
                pool.close()

    def _finish(
        self, planned: Plan, found: dict[int, Outcome], print_result: Callable[[str], None]
    ) -> list[str]:
        """Write and print one radical; returns its failures in words."""
        missing = Failure("interrupted", "interrupted before this level ended", ADVICE["interrupted"])
        outcomes = [found.get(level, missing) for level in range(len(planned.every_point))]
        result = assemble(planned, outcomes)
        print_result(full_report(result) + "\n")
        failures = _failures(result, planned, outcomes)
        try:
            folder = write_result(result, self.out)
        except StoreError as error:
            return [*failures, f"{planned.recipe.radical}: {error.message}; {ADVICE['store']}"]
        print_result(f"written to {folder}\n\n")
        return failures


def _failures(result: Result, planned: Plan, outcomes: Sequence[Outcome]) -> list[str]:
    return [
        f"{result.radical} {point.level.id}: {outcome.message}"
        + (f"; {outcome.advice}" if outcome.advice else "")
        for point, outcome in zip(planned.every_point, outcomes, strict=True)
        if isinstance(outcome, Failure)
    ]


def _engine(point: Point, report: Callable[[str, int, float], None] | None = None) -> State:
    from .electronic.solve import solve

    return solve(point, report)


def _say(text: str) -> None:
    """Module-level, so that a store which says things can travel to a worker process."""
    sys.stderr.write(text + "\n")
