"""Running points: here, in worker processes, or through anything that has `submit`.

Failures are outcomes, never exceptions: a point that cannot be computed gives a Failure and the rest goes on.
"""

from __future__ import annotations

import os
import queue
import threading
import time
from collections.abc import Callable, Sequence
from concurrent.futures import BrokenExecutor, Future, ProcessPoolExecutor
from multiprocessing import get_context
from typing import Any, Protocol

from .errors import ResourceError, UnpairedError, WorkerError
from .point import Point
from .state import Failure, State
from .store import Store

Outcome = State | Failure
Report = Callable[[str, int, float], None]
Solve = Callable[..., State]
"""solve(point, report) -> State, raising CalculationError."""

THREAD_VARIABLES = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")

ADVICE = {
    "not-converged": "check structure, charge and multiplicity, or try another level",
    "out-of-resources": "close other programs, use fewer --workers, or a smaller basis set",
    "worker-died": "the system ended its process, most often for lack of memory: use fewer --workers or a "
    "smaller basis set",
    "interrupted": "run the same command again: finished levels are not computed twice",
    "store": "free some disk space or give another --out, then run the same command again",
}
ADVICE_ELSE = "run it alone to see whether it repeats, and try another level"


class Submitter(Protocol):
    """What runs points: the standard library's executors and `dask.distributed.Client` both fit."""

    def submit(self, call: Callable[..., Any], /, *arguments: Any) -> Any:
        """Start `call(*arguments)`; the future returned has `result` and `add_done_callback`."""


class StoredSolve:
    """A solve that asks the store first and keeps what it computes. Can be pickled."""

    def __init__(self, solve: Solve, store: Store) -> None:
        self.solve = solve
        self.store = store

    def __call__(self, point: Point, report: Report | None = None) -> State:
        if (state := self.store.load(point)) is not None:
            return state
        with self.store.locked(point):
            if (state := self.store.load(point)) is not None:  # another process was faster
                return state
            state = self.solve(point, report)
            self.store.save(point, state)
            return state


def failure(error: BaseException) -> Failure:
    """The row that an exception becomes."""
    if isinstance(error, MemoryError):
        error = ResourceError("the memory did not suffice")
    if isinstance(error, UnpairedError):
        return Failure(error.tag, error.message, ADVICE.get(error.tag, ADVICE_ELSE))
    return Failure("unexpected", f"{type(error).__name__}: {error}", ADVICE_ELSE)


def attempt(solve: Solve, point: Point, report: Report | None = None) -> Outcome:
    """solve(point), with any failure as an outcome."""
    try:
        return solve(point, report)
    except Exception as error:
        return failure(error)


class Here:
    """Runs everything at once in this process."""

    def submit(self, call: Callable[..., Any], /, *arguments: Any) -> Future[Any]:
        """Run now; Ctrl-C passes through."""
        future: Future[Any] = Future()
        future.set_result(call(*arguments))
        return future


class Pool:
    """Worker processes that are started anew when one of them dies."""

    def __init__(self, workers: int, threads_each: int) -> None:
        self.workers = workers
        self.threads_each = threads_each
        self._pool: ProcessPoolExecutor | None = None

    def submit(self, call: Callable[..., Any], /, *arguments: Any) -> Future[Any]:
        """Start `call(*arguments)` in a worker."""
        try:
            return self._running().submit(call, *arguments)
        except BrokenExecutor:
            self.close()
            return self._running().submit(call, *arguments)

    def close(self) -> None:
        """End the workers at once."""
        if self._pool is not None:
            processes = list((self._pool._processes or {}).values())
            self._pool.shutdown(wait=False, cancel_futures=True)
            for process in processes:
                process.terminate()
            self._pool = None

    def _running(self) -> ProcessPoolExecutor:
        if self._pool is None:
            # Thread counts are read when numpy and PySCF are loaded, which the children do after this.
            before = {name: os.environ.get(name) for name in THREAD_VARIABLES}
            os.environ.update(dict.fromkeys(THREAD_VARIABLES, str(self.threads_each)))
            try:
                self._pool = ProcessPoolExecutor(
                    self.workers, get_context("spawn"), initializer=_die_with, initargs=(os.getpid(),)
                )
                list(self._pool.map(_nothing, range(self.workers)))
            finally:
                for name, value in before.items():
                    os.environ.pop(name)
                    if value is not None:
                        os.environ[name] = value
        return self._pool


def _nothing(_: int) -> None:
    """Makes the pool start its processes while the environment is set for them."""
    time.sleep(0.05)


def _die_with(parent: int) -> None:
    """A worker whose parent was killed ends itself within a second; Ctrl-C is the parent's to handle."""
    import signal

    signal.signal(signal.SIGINT, signal.SIG_IGN)

    def watch() -> None:
        while os.getppid() == parent:
            time.sleep(0.5)
        os._exit(1)

    threading.Thread(target=watch, daemon=True).start()


def run_points(
    points: Sequence[Point],
    call: Callable[[Point], Outcome],
    executor: Submitter,
    done: Callable[[int, Outcome], None],
    *,
    at_once: int = 1,
    memory_of: Callable[[Point], int] = lambda point: 0,
    memory_limit_bytes: int = 0,
) -> None:
    """Run every point and call `done(place, outcome)` as each ends, in any order.

    `at_once` points run side by side, fewer where the sum of `memory_of` would pass `memory_limit_bytes`
    (one always runs). When a worker dies, the points that were running are tried once more, each alone, so
    that only the guilty one becomes a Failure.
    """
    waiting = list(range(len(points)))
    suspects: list[int] = []
    running: dict[int, int] = {}
    ended: queue.SimpleQueue[tuple[int, Any]] = queue.SimpleQueue()

    def start(place: int) -> None:
        running[place] = memory_of(points[place])
        future = executor.submit(call, points[place])
        future.add_done_callback(lambda future, place=place: ended.put((place, future)))

    def next_that_fits() -> int | None:
        if len(running) >= at_once:
            return None
        for place in waiting:
            if not running or sum(running.values()) + memory_of(points[place]) <= memory_limit_bytes:
                return place
        return None

    tried_alone: set[int] = set()
    while waiting or running or suspects:
        if suspects and not running:
            tried_alone.add(suspects[0])
            start(suspects.pop(0))
        elif not suspects:
            while (place := next_that_fits()) is not None:
                waiting.remove(place)
                start(place)
        place, future = ended.get()
        del running[place]
        try:
            outcome = future.result()
        except Exception as error:
            # The worker died: `call` itself never raises.
            if place not in tried_alone:
                suspects.append(place)
                continue
            outcome = failure(WorkerError(f"the process computing it died ({type(error).__name__})"))
        done(place, outcome)
