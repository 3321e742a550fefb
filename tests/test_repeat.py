"""The same question gets the same answer: again, turned, and with the threads that were allowed.

Limits of the task: two runs 1e-8 Eh and 1e-5 mT; a turned molecule 1e-6 Eh and 0.002 mT.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from unpaired.constants import BOHR_ANGSTROM, contact_coupling_MHz, mT_from_MHz
from unpaired.electronic.solve import solve
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.nuclei import table_isotope
from unpaired.point import Point
from unpaired.properties.contact import spin_density_at_nuclei
from unpaired.structures.xyz import read_xyz

ROOT = Path(__file__).parents[1]
FORMYL = Molecule(
    ("C", "O", "H"), np.array([[0, 0, 0], [0, 0, 1.18], [0.94, 0, -0.61]]) / BOHR_ANGSTROM, 0, 2
)
CYANO = Molecule(("C", "N"), np.array([[0, 0, 0], [0, 0, 1.172]]) / BOHR_ANGSTROM, 0, 2)
TURN = Rotation.from_rotvec([0.4, -1.1, 0.7]).as_matrix()


def shipped(name: str) -> Molecule:
    geometry = read_xyz(ROOT / "molecules" / f"{name}.xyz")
    return Molecule(geometry.elements, geometry.coordinates_bohr, 0, 2)


def answer(molecule: Molecule, level: Level) -> tuple[float, np.ndarray]:
    """Energy in Eh and couplings of all nuclei in mT."""
    state = solve(Point(molecule, level))
    densities = spin_density_at_nuclei(state.solution.spin_density_matrix, state.ao_at_nuclei)
    isotopes = [table_isotope(element) for element in molecule.elements]
    return state.energy_Eh, np.array(
        [
            mT_from_MHz(contact_coupling_MHz(float(density), isotope.nuclear_g, molecule.multiplicity))
            for density, isotope in zip(densities, isotopes, strict=True)
            if isotope is not None
        ]
    )


UHF, UKS = Level("UHF", "pcH-1"), Level("UKS", "pcH-1", "B3LYP")
SLOW = pytest.mark.slow


@pytest.mark.parametrize(
    ("molecule", "level"),
    [
        (FORMYL, UHF),
        (FORMYL, UKS),
        pytest.param(CYANO, UHF, marks=SLOW),  # contaminated, several solutions
        pytest.param(CYANO, UKS, marks=SLOW),
        pytest.param(shipped("vinyl"), UKS, marks=SLOW),
        pytest.param(shipped("allyl"), UHF, marks=SLOW),
        pytest.param(shipped("methyl"), UKS, marks=SLOW),  # a symmetric top: nothing tells its axes apart
    ],
    ids=["formyl-UHF", "formyl-UKS", "CN-UHF", "CN-UKS", "vinyl-UKS", "allyl-UHF", "methyl-UKS"],
)
def test_again_and_turned_gives_the_same(molecule: Molecule, level: Level) -> None:
    energy, couplings = answer(molecule, level)
    again, again_couplings = answer(molecule, level)
    assert again == pytest.approx(energy, abs=1e-8)
    assert again_couplings == pytest.approx(couplings, abs=1e-5)
    turned, turned_couplings = answer(molecule.moved(molecule.coordinates_bohr @ TURN.T + 1.3), level)
    assert turned == pytest.approx(energy, abs=1e-6)
    assert turned_couplings == pytest.approx(couplings, abs=0.002)


BUSY = """
import json, os
from pathlib import Path
from unpaired.electronic.solve import solve
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point
from unpaired.structures.xyz import read_xyz

busiest = {}

def look(*_):
    for task in Path("/proc/self/task").iterdir():
        fields = (task / "stat").read_text().rpartition(")")[2].split()
        ticks = int(fields[11]) + int(fields[12])  # user and system time, proc(5)
        busiest[task.name] = max(ticks, busiest.get(task.name, 0))

geometry = read_xyz(Path(os.environ["STRUCTURE"]))
solve(Point(Molecule(geometry.elements, geometry.coordinates_bohr, 0, 2), Level("UKS", "pcH-1", "B3LYP")), look)
look()
print(json.dumps(sorted(busiest.values(), reverse=True)))
"""


def busy_threads(allowed: int) -> int:
    """Threads of a process that computed for a fifth of a second or more, with OMP_NUM_THREADS set."""
    inherited = {name: value for name, value in os.environ.items() if not name.endswith("_NUM_THREADS")}
    environment = inherited | {
        "OMP_NUM_THREADS": str(allowed),
        "STRUCTURE": str(ROOT / "molecules" / "allyl.xyz"),
        "PYTHONPATH": os.pathsep.join([str(ROOT / "src"), *sys.path]),
    }
    done = subprocess.run(
        [sys.executable, "-c", BUSY], env=environment, capture_output=True, text=True, timeout=300, check=True
    )
    ticks = json.loads(done.stdout.splitlines()[-1])
    return sum(one >= 0.2 * os.sysconf("SC_CLK_TCK") for one in ticks)


@pytest.mark.slow
@pytest.mark.skipif(not Path("/proc/self/task").exists(), reason="looks at threads in /proc")
def test_one_thread_is_used_where_one_is_allowed() -> None:
    assert busy_threads(1) == 1


@pytest.mark.slow
@pytest.mark.skipif(not Path("/proc/self/task").exists(), reason="looks at threads in /proc")
@pytest.mark.skipif((os.cpu_count() or 1) < 2, reason="needs two cores")
def test_two_threads_are_used_where_two_are_allowed() -> None:
    """The count above can tell one thread from several."""
    assert busy_threads(2) >= 2
