"""Small points and states for tests, with made-up orbitals: nothing here is a prediction."""

from __future__ import annotations

import os
import signal
from pathlib import Path

import numpy as np

from unpaired.errors import ConvergenceError
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point
from unpaired.result import Result
from unpaired.state import Solution, State


def hydrogen(distance_bohr: float = 0.0, charge: int = 0, scf: str = "UHF") -> Point:
    """A hydrogen atom, moved along z so that points differ."""
    return Point(Molecule(("H",), np.array([[0.0, 0.0, distance_bohr]]), charge, 2), Level(scf, "pcH-1"))


def state(seed: int = 0) -> State:
    """Two made-up solutions in four basis functions."""
    random = np.random.default_rng(seed)

    def solution(energy: float, label: str) -> Solution:
        return Solution(
            energy_Eh=energy,
            s_squared=0.75 + random.random() / 100,
            stable=True,
            label=label,
            origin="made up",
            orbitals=random.normal(size=(2, 4, 4)),
            occupations=np.array([[1.0, 1.0, 0.0, 0.0], [1.0, 0.0, 0.0, 0.0]]),
            orbital_energies_Eh=random.normal(size=(2, 4)),
        )

    return State(
        solutions=(solution(-1.5, "A"), solution(-1.25, "B")),
        taken=0,
        overlap=np.eye(4),
        ao_at_nuclei=random.normal(size=(1, 4)),
        iterations=7,
        wall_s=0.125,
        story=("made up",),
        engine={"functional": None, "grid_level": 1},
    )


def identity(level: Level) -> dict[str, object]:
    """Stands in for the engine's identity."""
    return {"engine_version": 1, "accuracy": level.accuracy}


def fake_solve(point: Point, report: object = None) -> State:
    """A state that depends on the point, at once."""
    return state(seed=round(1000 * abs(float(point.molecule.coordinates_bohr[0, 2]))))


def moody_solve(point: Point, report: object = None) -> State:
    """Fails at z = 1, dies at z = 2, raises something unexpected at z = 3."""
    z = float(point.molecule.coordinates_bohr[0, 2])
    if z == 1.0:
        raise ConvergenceError("no state found")
    if z == 2.0:
        os.kill(os.getpid(), signal.SIGKILL)
    if z == 3.0:
        raise ZeroDivisionError("by hand")
    return fake_solve(point)


def counting_solve(point: Point, report: object = None) -> State:
    """Leaves a mark in the folder named by COUNT_FOLDER each time it computes."""
    folder = Path(os.environ["COUNT_FOLDER"])
    number = len(list(folder.iterdir()))
    (folder / f"{point.key({})}-{os.getpid()}-{number}").touch()
    return fake_solve(point)


def same_state(one: State, other: State) -> bool:
    """Equal to the last bit."""
    same = (
        one.taken == other.taken
        and one.iterations == other.iterations
        and one.wall_s == other.wall_s
        and one.story == other.story
        and one.engine == other.engine
        and len(one.solutions) == len(other.solutions)
        and np.array_equal(one.overlap, other.overlap)
        and np.array_equal(one.ao_at_nuclei, other.ao_at_nuclei)
    )
    return same and all(
        (a.energy_Eh, a.s_squared, a.stable, a.label, a.origin)
        == (b.energy_Eh, b.s_squared, b.stable, b.label, b.origin)
        and np.array_equal(a.orbitals, b.orbitals)
        and np.array_equal(a.occupations, b.occupations)
        and np.array_equal(a.orbital_energies_Eh, b.orbital_energies_Eh)
        for a, b in zip(one.solutions, other.solutions, strict=True)
    )


def result(radical: str = "sample", levels: tuple[str, ...] = ("UHF", "ROHF")) -> Result:
    """A record with made-up numbers: one hydrogen atom per level."""
    couplings, states = [], []
    for scf in levels:
        names = {
            "radical": radical,
            "level": f"{scf}/pcH-1",
            "scf": scf,
            "functional": None,
            "basis": "pcH-1",
        }
        couplings.append(
            names
            | {"atom": "H1", "isotope": "1H", "group": "H1", "group_size": 1, "spin_density_au": 0.3}
            | {"a_iso_MHz": 1340.5, "a_iso_mT": 47.83, "a_group_mT": 47.83, "flags": ""}
        )
        states.append(
            names
            | {"basis_functions": 3, "energy_Eh": -0.5, "s_squared": 0.75, "s_squared_exact": 0.75}
            | {"contamination": 0.0, "converged": True, "stable": None, "iterations": 4, "wall_s": 0.5}
            | {"flags": ""}
        )
    return Result(
        radical=radical,
        recipe={
            "radical": radical,
            "charge": 0,
            "multiplicity": 2,
            "solvent": None,
            "measured": [],
            "levels": [Level(scf, "pcH-1").to_dict() for scf in levels],
        },
        molecule=hydrogen().molecule,
        tables={"couplings": couplings, "states": states, "flags": []},
        structure_note="made up",
    )
