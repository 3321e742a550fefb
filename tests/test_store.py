"""The store: found again by everything that decides the numbers, whole or not at all, damage noticed."""

from __future__ import annotations

import dataclasses
import json
import multiprocessing
import os
import pickle
import resource
from pathlib import Path

import pytest
from samples import counting_solve, fake_solve, hydrogen, identity, same_state, state

from unpaired.errors import StoreError
from unpaired.execute import StoredSolve
from unpaired.level import Level
from unpaired.point import Point, Solvent
from unpaired.store import Store


@pytest.fixture
def store(tmp_path: Path) -> Store:
    return Store(tmp_path, identity)


def test_a_saved_state_comes_back_to_the_last_bit(store: Store) -> None:
    store.save(hydrogen(), state())
    found = store.load(hydrogen())
    assert found is not None
    assert same_state(found, state())


def test_an_empty_store_has_nothing(store: Store) -> None:
    assert store.load(hydrogen()) is None


@pytest.mark.parametrize(
    "change",
    [
        lambda point: hydrogen(distance_bohr=1e-9),
        lambda point: dataclasses.replace(point, level=Level("ROHF", "pcH-1")),
        lambda point: dataclasses.replace(point, level=Level("UHF", "pcH-2")),
        lambda point: dataclasses.replace(point, level=Level("UHF", "pcH-1", accuracy="quick")),
        lambda point: dataclasses.replace(point, level=Level("UHF", "pcH-1", solution=2)),
        lambda point: dataclasses.replace(point, solvent=Solvent("water", 78.4)),
        lambda point: dataclasses.replace(
            point, molecule=dataclasses.replace(point.molecule, charge=-1, multiplicity=3)
        ),
    ],
)
def test_whatever_decides_the_numbers_changes_the_key(store: Store, change) -> None:
    assert store.key(change(hydrogen())) != store.key(hydrogen())


def test_a_name_decides_nothing(store: Store) -> None:
    named = dataclasses.replace(hydrogen(), level=Level("UHF", "pcH-1", name="mine"))
    assert store.key(named) == store.key(hydrogen())


def test_another_engine_version_is_never_served(tmp_path: Path) -> None:
    Store(tmp_path, identity).save(hydrogen(), state())
    newer = Store(tmp_path, lambda level: {**identity(level), "engine_version": 2})
    assert newer.load(hydrogen()) is None


def damage_truncate(file: Path) -> None:
    file.write_bytes(file.read_bytes()[:-20])


def damage_flip(file: Path) -> None:
    data = bytearray(file.read_bytes())
    data[len(data) // 2] ^= 1
    file.write_bytes(data)


def damage_empty(file: Path) -> None:
    file.write_bytes(b"")


def damage_remove(file: Path) -> None:
    file.unlink()


@pytest.mark.parametrize("name", ["state.json", "arrays.npz"])
@pytest.mark.parametrize("damage", [damage_truncate, damage_flip, damage_empty, damage_remove])
def test_a_damaged_entry_is_said_set_aside_and_computed_again(tmp_path: Path, name, damage) -> None:
    said: list[str] = []
    store = Store(tmp_path, identity, said.append)
    solve = StoredSolve(fake_solve, store)
    solve(hydrogen())
    damage(store.place(hydrogen()) / name)
    again = solve(hydrogen())
    assert same_state(again, fake_solve(hydrogen()))
    assert len(said) == 1
    assert "damaged" in said[0]
    assert store.place(hydrogen()).with_name(store.key(hydrogen()) + ".damaged-1").is_dir()
    assert store.load(hydrogen()) is not None


def test_a_changed_energy_in_the_text_is_noticed(tmp_path: Path) -> None:
    said: list[str] = []
    store = Store(tmp_path, identity, said.append)
    store.save(hydrogen(), state())
    file = store.place(hydrogen()) / "state.json"
    whole = json.loads(file.read_text())
    whole["state"]["solutions"][0]["energy_Eh"] = -1.75
    file.write_text(json.dumps(whole))
    assert store.load(hydrogen()) is None
    assert "checksum of state.json" in said[0]


def test_nothing_in_an_entry_is_pickled(store: Store) -> None:
    store.save(hydrogen(), state())
    import numpy as np

    with np.load(store.place(hydrogen()) / "arrays.npz", allow_pickle=False) as arrays:
        assert all(arrays[name].dtype.kind == "f" for name in arrays.files)


def test_saving_twice_keeps_the_first(store: Store) -> None:
    store.save(hydrogen(), state(1))
    store.save(hydrogen(), state(2))
    found = store.load(hydrogen())
    assert found is not None
    assert same_state(found, state(1))


def test_a_store_can_travel_to_a_worker(store: Store) -> None:
    assert pickle.loads(pickle.dumps(store)).key(hydrogen()) == store.key(hydrogen())


def test_a_read_only_folder_is_a_store_error(store: Store, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object, **__: object) -> None:
        raise OSError(30, "Read-only file system")

    monkeypatch.setattr("unpaired.store.tempfile.mkdtemp", refuse)
    with pytest.raises(StoreError, match="Read-only file system"):
        store.save(hydrogen(), state())


def _save_with_a_small_limit(out: Path, answer: multiprocessing.Queue[str]) -> None:
    resource.setrlimit(resource.RLIMIT_FSIZE, (1000, 1000))
    try:
        Store(out, identity).save(hydrogen(), state())
    except StoreError as error:
        answer.put(str(error))


def test_a_full_disk_leaves_no_half_entry(store: Store, tmp_path: Path) -> None:
    """RLIMIT_FSIZE stands for the full disk: a write past it fails with EFBIG."""
    context = multiprocessing.get_context("spawn")
    answer: multiprocessing.Queue[str] = context.Queue()
    process = context.Process(target=_save_with_a_small_limit, args=(tmp_path, answer))
    process.start()
    process.join()
    assert "File too large" in answer.get(timeout=5)
    assert store.load(hydrogen()) is None
    assert list(store.folder.iterdir()) == []


def _compute(out: Path, folder: Path) -> None:
    os.environ["COUNT_FOLDER"] = str(folder)
    StoredSolve(counting_solve, Store(out, identity))(hydrogen())


def test_processes_at_the_same_time_compute_a_point_once(tmp_path: Path) -> None:
    count = tmp_path / "count"
    count.mkdir()
    context = multiprocessing.get_context("spawn")
    processes = [context.Process(target=_compute, args=(tmp_path / "out", count)) for _ in range(4)]
    for process in processes:
        process.start()
    for process in processes:
        process.join()
    assert [process.exitcode for process in processes] == [0, 0, 0, 0]
    assert len(list(count.iterdir())) == 1


def test_a_clock_that_goes_back_changes_nothing(store: Store) -> None:
    solve = StoredSolve(fake_solve, store)
    first = solve(hydrogen())
    for file in store.place(hydrogen()).iterdir():
        os.utime(file, (4e9, 4e9))
    assert same_state(solve(hydrogen()), first)
    assert Point(hydrogen().molecule, hydrogen().level).key({}) == hydrogen().key({})
