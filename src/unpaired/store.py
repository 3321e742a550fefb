"""Finished points on disk, found again by everything that decides their numbers.

An entry is a folder OUT/.store/<key> with `arrays.npz` and `state.json`; it appears in one rename, so a kill
leaves the whole entry or none. Both files carry checksums: a damaged entry is set aside, said, and computed
again. A lock per key, released by the system when its holder dies, keeps two processes from computing the
same point at the same time.
"""

from __future__ import annotations

import contextlib
import fcntl
import hashlib
import io
import json
import os
import shutil
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import numpy as np

from .errors import StoreError
from .files import write_atomically
from .point import Point
from .state import Solution, State

FORMAT = 1
STORE_FOLDER = ".store"

Say = Callable[[str], None]
Identity = Callable[[Any], dict[str, object]]


class Store:
    """Finished states below one results folder. Cheap to make; holds no open files; can be pickled."""

    def __init__(self, out: Path, identity: Identity, say: Say | None = None) -> None:
        self.folder = out / STORE_FOLDER
        self.identity = identity
        self.say = say

    def key(self, point: Point) -> str:
        """Name of the point's entry."""
        return point.key(self.identity(point.level))

    def place(self, point: Point) -> Path:
        """Folder of the point's entry, whether it is there or not."""
        return self.folder / self.key(point)

    def has(self, point: Point) -> bool:
        """True if there is an entry, whole or damaged."""
        return self.place(point).is_dir()

    def load(self, point: Point) -> State | None:
        """The stored state, or None. A damaged entry is set aside and counts as None."""
        if not self.has(point):
            return None
        place = self.place(point)
        try:
            return decode((place / "state.json").read_bytes(), (place / "arrays.npz").read_bytes())
        except (OSError, ValueError, KeyError, TypeError) as error:
            self._set_aside(place, error)
            return None

    def save(self, point: Point, state: State) -> None:
        """Write an entry. Raises StoreError if the disk refuses; a whole older entry is kept."""
        text, arrays = encode(state, point)
        place = self.place(point)
        try:
            self.folder.mkdir(parents=True, exist_ok=True)
            temporary = Path(tempfile.mkdtemp(dir=self.folder, prefix=".writing-"))
        except OSError as error:
            raise StoreError(f"{self.folder}: cannot be written ({error.strerror or error})") from None
        try:
            write_atomically(temporary / "arrays.npz", arrays)
            write_atomically(temporary / "state.json", text)
            try:
                os.rename(temporary, place)
            except OSError as error:
                if not place.is_dir():
                    raise StoreError(f"{place}: cannot be written ({error.strerror or error})") from None
        finally:
            shutil.rmtree(temporary, ignore_errors=True)

    @contextlib.contextmanager
    def locked(self, point: Point) -> Iterator[None]:
        """Hold the lock of the point's key; waits while another process computes the same point."""
        lock = self.folder / f"{self.key(point)}.lock"
        try:
            self.folder.mkdir(parents=True, exist_ok=True)
            handle = os.open(lock, os.O_RDWR | os.O_CREAT, 0o644)
        except OSError as error:
            raise StoreError(f"{lock}: cannot be written ({error.strerror or error})") from None
        try:
            fcntl.flock(handle, fcntl.LOCK_EX)
            yield
        finally:
            os.close(handle)

    def _set_aside(self, place: Path, reason: Exception) -> None:
        number = 1
        while (aside := place.with_name(f"{place.name}.damaged-{number}")).exists():
            number += 1
        with contextlib.suppress(FileNotFoundError):  # another process was faster
            os.rename(place, aside)
        if self.say is not None:
            self.say(
                f"{place}: stored state is damaged ({reason}); set aside as {aside.name}, computing again"
            )


def encode(state: State, point: Point) -> tuple[bytes, bytes]:
    """A state as JSON text and an npz archive, each bytes."""
    arrays: dict[str, np.ndarray[Any, Any]] = {
        "overlap": state.overlap,
        "ao_at_nuclei": state.ao_at_nuclei,
    }
    solutions = []
    for place, solution in enumerate(state.solutions):
        arrays[f"orbitals_{place}"] = solution.orbitals
        arrays[f"occupations_{place}"] = solution.occupations
        arrays[f"orbital_energies_{place}"] = solution.orbital_energies_Eh
        solutions.append(
            {
                "energy_Eh": solution.energy_Eh,
                "s_squared": solution.s_squared,
                "stable": solution.stable,
                "label": solution.label,
                "origin": solution.origin,
            }
        )
    buffer = io.BytesIO()
    np.savez(buffer, **arrays)  # type: ignore[arg-type]
    packed = buffer.getvalue()
    body = {
        "format": FORMAT,
        "point": point.question(),
        "solutions": solutions,
        "taken": state.taken,
        "iterations": state.iterations,
        "wall_s": state.wall_s,
        "story": list(state.story),
        "engine": state.engine,
        "arrays_sha256": hashlib.sha256(packed).hexdigest(),
    }
    text = json.dumps(body, indent=1, allow_nan=False)
    whole = {"sha256": hashlib.sha256(text.encode()).hexdigest(), "state": body}
    return json.dumps(whole, indent=1, allow_nan=False).encode(), packed


def decode(text: bytes, arrays: bytes) -> State:
    """The inverse of `encode`. Raises ValueError or KeyError if a checksum or the form is wrong."""
    whole = json.loads(text)
    body = whole["state"]
    if hashlib.sha256(json.dumps(body, indent=1).encode()).hexdigest() != whole["sha256"]:
        raise ValueError("the checksum of state.json is wrong")
    if body["format"] != FORMAT:
        raise ValueError(f"its format is {body['format']}, not {FORMAT}")
    if hashlib.sha256(arrays).hexdigest() != body["arrays_sha256"]:
        raise ValueError("the checksum of arrays.npz is wrong")
    with np.load(io.BytesIO(arrays), allow_pickle=False) as data:
        solutions = tuple(
            Solution(
                **fields,
                orbitals=data[f"orbitals_{place}"],
                occupations=data[f"occupations_{place}"],
                orbital_energies_Eh=data[f"orbital_energies_{place}"],
            )
            for place, fields in enumerate(body["solutions"])
        )
        return State(
            solutions=solutions,
            taken=body["taken"],
            overlap=data["overlap"],
            ao_at_nuclei=data["ao_at_nuclei"],
            iterations=body["iterations"],
            wall_s=body["wall_s"],
            story=tuple(body["story"]),
            engine=body["engine"],
        )
