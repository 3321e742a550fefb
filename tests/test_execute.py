"""Running points: failures become outcomes, a dead worker costs only its own point, memory is respected."""

from __future__ import annotations

import functools
import threading
import time
from concurrent.futures import Future, ThreadPoolExecutor

import pytest
from samples import fake_solve, hydrogen, moody_solve, same_state

from unpaired import errors
from unpaired.execute import Here, Outcome, Pool, attempt, failure, run_points
from unpaired.state import Failure, State


def outcomes_of(distances: list[float], executor: object, **options: object) -> dict[int, Outcome]:
    found: dict[int, Outcome] = {}
    points = [hydrogen(distance) for distance in distances]
    run_points(points, functools.partial(attempt, moody_solve), executor, found.__setitem__, **options)
    return found


def test_every_point_has_an_outcome_and_failures_stop_nothing() -> None:
    found = outcomes_of([0.0, 1.0, 3.0, 4.0], Here())
    assert isinstance(found[0], State)
    assert found[1] == Failure(
        "not-converged", "no state found", "check structure, charge and multiplicity, or try another level"
    )
    assert isinstance(found[2], Failure)
    assert found[2].message == "ZeroDivisionError: by hand"
    assert isinstance(found[3], State)


def test_a_worker_that_is_killed_costs_only_its_own_point() -> None:
    pool = Pool(workers=2, threads_each=1)
    try:
        found = outcomes_of([0.0, 2.0, 4.0, 5.0, 6.0], pool, at_once=2, memory_limit_bytes=1)
    finally:
        pool.close()
    assert [isinstance(found[place], State) for place in range(5)] == [True, False, True, True, True]
    assert isinstance(found[1], Failure)
    assert found[1].code == "worker-died"


def test_workers_give_what_this_process_gives() -> None:
    pool = Pool(workers=2, threads_each=1)
    try:
        found = outcomes_of([0.0, 4.0, 5.0], pool, at_once=2)
    finally:
        pool.close()
    for place, distance in enumerate([0.0, 4.0, 5.0]):
        outcome = found[place]
        assert isinstance(outcome, State)
        assert same_state(outcome, fake_solve(hydrogen(distance)))


def test_points_that_do_not_fit_together_run_one_after_another() -> None:
    running, most = 0, 0
    lock = threading.Lock()

    def watch(point: object) -> Outcome:
        nonlocal running, most
        with lock:
            running += 1
            most = max(most, running)
        time.sleep(0.01)
        with lock:
            running -= 1
        return Failure("made-up", "")

    points = [hydrogen(float(place)) for place in range(6)]
    with ThreadPoolExecutor(4) as executor:
        run_points(
            points,
            watch,
            executor,
            lambda *_: None,
            at_once=4,
            memory_of=lambda point: 60,
            memory_limit_bytes=130,
        )
    assert most == 2


def test_a_point_larger_than_the_memory_still_runs_alone() -> None:
    found = outcomes_of([0.0, 4.0], Here(), memory_of=lambda point: 100, memory_limit_bytes=10)
    assert sorted(found) == [0, 1]


def test_an_interrupt_goes_through() -> None:
    def interrupted(point: object) -> Outcome:
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        run_points([hydrogen()], interrupted, Here(), lambda *_: None)


@pytest.mark.parametrize(
    ("error", "code"),
    [
        (errors.ConvergenceError("x"), "not-converged"),
        (errors.ResourceError("x"), "out-of-resources"),
        (errors.WorkerError("x"), "worker-died"),
        (errors.EngineError("x"), "engine"),
        (errors.StoreError("x"), "store"),
        (MemoryError(), "out-of-resources"),
        (ValueError("x"), "unexpected"),
    ],
)
def test_every_error_becomes_a_row_with_advice(error: Exception, code: str) -> None:
    row = failure(error)
    assert row.code == code
    assert row.advice


def test_anything_with_submit_runs_points() -> None:
    class Later:
        """Completes each future from another thread, as a remote scheduler would."""

        def submit(self, call, /, *arguments):
            future: Future = Future()
            threading.Timer(0.01, lambda: future.set_result(call(*arguments))).start()
            return future

    assert sorted(outcomes_of([0.0, 4.0, 5.0], Later(), at_once=3)) == [0, 1, 2]


@pytest.mark.slow
@pytest.mark.filterwarnings("default")
def test_a_dask_client_runs_points_as_it_is() -> None:
    distributed = pytest.importorskip("distributed")
    with (
        distributed.LocalCluster(
            n_workers=2, threads_per_worker=1, host="127.0.0.1", dashboard_address=None
        ) as cluster,
        distributed.Client(cluster) as client,
    ):
        found = outcomes_of([0.0, 1.0, 4.0], client, at_once=2)
    assert isinstance(found[1], Failure)
    for place, distance in ((0, 0.0), (2, 4.0)):
        outcome = found[place]
        assert isinstance(outcome, State)
        assert same_state(outcome, fake_solve(hydrogen(distance)))
