"""How fast: races against a plain script, growth with the number of functions, and what the machine allows.

    python tests/benchmarks/speed.py race molecules/benzyl.xyz     UKS-B3LYP/pcH-1 against plain.py, best of two
    python tests/benchmarks/speed.py levels molecules/benzyl.xyz   the three default levels against three plain scripts
    python tests/benchmarks/speed.py settings molecules/allyl.xyz  quick, standard and reference accuracy
    python tests/benchmarks/speed.py growth                        time and memory from 190 to 455 functions
    python tests/benchmarks/speed.py floor molecules/benzyl.xyz    time of each stage over that of its multiplications

Programs run in turn, each in a process of its own with the same threads (OMP_NUM_THREADS, else all cores), so that load
by others hits both alike. Wall and processor time are printed: on a busy machine trust the latter.
"""

from __future__ import annotations

import functools
import json
import os
import subprocess
import sys
import tempfile
import time
from collections import defaultdict
from collections.abc import Callable
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

HERE = Path(__file__).parent
DEFAULT_LEVELS = ("UHF/pcH-1", "ROHF/pcH-1", "UKS/pcH-1/B3LYP")
GROWTH = {
    "butyl": "[CH2]CCC",
    "diethyl nitroxide": "CCN([O])CC",
    "diisopropyl nitroxide": "CC(C)N([O])C(C)C",
    "tetramethylpiperidine-N-oxyl": "CC1(C)CCCC(C)(C)N1[O]",
}
PROTON_mT = 159.49
"""mT per bohr^-3 of spin density for 1H, the largest of all nuclei here."""


class Run(NamedTuple):
    """One process."""

    wall_s: float
    cpu_s: float
    peak_MiB: float
    answer: dict[str, Any]


def run(*command: str) -> Run:
    """Run a script of this folder and read its line of JSON."""
    started = time.perf_counter()
    with tempfile.TemporaryFile() as output:
        process = subprocess.Popen([sys.executable, str(HERE / command[0]), *command[1:]], stdout=output)
        _, status, used = os.wait4(process.pid, 0)
        process.returncode = os.waitstatus_to_exitcode(status)
        wall = time.perf_counter() - started
        if process.returncode:
            raise SystemExit(f"{' '.join(command)} ended with {process.returncode}")
        output.seek(0)
        answer = json.loads(output.read())
    unit = 2**20 if sys.platform == "darwin" else 2**10
    return Run(wall, used.ru_utime + used.ru_stime, used.ru_maxrss / unit, answer)


def best(runs: list[Run]) -> Run:
    """The quickest."""
    return min(runs, key=lambda one: one.wall_s)


def race(path: str, repeats: int = 2) -> None:
    """One level against the plain script."""
    ours, plain = [], []
    for _ in range(repeats):
        ours.append(run("ours.py", path, DEFAULT_LEVELS[-1]))
        plain.append(run("plain.py", path, "UKS", "pcH-1", "B3LYP"))
    mine, theirs = best(ours), best(plain)
    stability = mine.answer["stability_s"]
    before = mine.wall_s - stability
    apart = np.abs(np.subtract(mine.answer["levels"][0]["spin_density_au"], theirs.answer["spin_density_au"]))
    print(f"{path} UKS-B3LYP/pcH-1, {mine.answer['levels'][0]['functions']} functions, best of {repeats}")
    print(
        f"  plain script      {theirs.wall_s:8.1f} s  cpu {theirs.cpu_s:8.1f} s  {theirs.peak_MiB:6.0f} MiB"
    )
    print(f"  ours              {mine.wall_s:8.1f} s  cpu {mine.cpu_s:8.1f} s  {mine.peak_MiB:6.0f} MiB")
    print(f"  of it stability   {stability:8.1f} s")
    print(
        f"  times faster: {theirs.wall_s / before:.2f} before, {theirs.wall_s / mine.wall_s:.2f} with stability"
    )
    print(f"  times less processor time: {theirs.cpu_s / mine.cpu_s:.2f} with stability")
    print(
        f"  largest change: {apart.max():.1e} bohr^-3, {PROTON_mT * apart.max():.4f} mT if it were a proton"
    )


def levels(path: str, repeats: int = 2) -> None:
    """The default levels in one process against as many plain scripts."""
    ours, plain = [], []
    for _ in range(repeats):
        ours.append(run("ours.py", path, *DEFAULT_LEVELS))
        plain.append([run("plain.py", path, *level.split("/")) for level in DEFAULT_LEVELS])
    mine = best(ours)
    theirs = min(plain, key=lambda three: sum(one.wall_s for one in three))
    wall, cpu = (sum(getattr(one, what) for one in theirs) for what in ("wall_s", "cpu_s"))
    before = mine.wall_s - mine.answer["stability_s"]
    print(f"{path}, {', '.join(DEFAULT_LEVELS)}, best of {repeats}")
    for level, one in zip(DEFAULT_LEVELS, theirs, strict=True):
        print(f"  plain {level:20}{one.wall_s:8.1f} s  cpu {one.cpu_s:8.1f} s")
    print(f"  plain together            {wall:8.1f} s  cpu {cpu:8.1f} s")
    print(f"  ours together             {mine.wall_s:8.1f} s  cpu {mine.cpu_s:8.1f} s, "
          f"stability {mine.answer['stability_s']:.1f} s")  # fmt: skip
    print(f"  times faster: {wall / before:.2f} before, {wall / mine.wall_s:.2f} with stability")
    print(f"  times less processor time: {cpu / mine.cpu_s:.2f} with stability")


def settings(path: str) -> None:
    """The three accuracies of the last default level, each in a process of its own."""
    print(f"{path} {DEFAULT_LEVELS[-1]}")
    standard = 0.0
    for accuracy in ("standard", "quick", "reference"):
        one = run("ours.py", path, f"{DEFAULT_LEVELS[-1]}/{accuracy}")
        standard = standard or one.cpu_s
        print(f"  {accuracy:10}{one.wall_s:8.1f} s  cpu {one.cpu_s:8.1f} s, {one.cpu_s / standard:6.2f} times "
              f"that of standard, {one.peak_MiB:6.0f} MiB", flush=True)  # fmt: skip


def growth() -> None:
    """Time against basis functions and the exponent of a power law through it."""
    sizes, walls, cpus = [], [], []
    for name, smiles in GROWTH.items():
        with tempfile.TemporaryDirectory() as folder:
            path = Path(folder) / "structure.xyz"
            path.write_text(force_field(smiles))
            one = run("ours.py", str(path), DEFAULT_LEVELS[-1])
        sizes.append(one.answer["levels"][0]["functions"])
        walls.append(one.wall_s)
        cpus.append(one.cpu_s)
        print(f"{name:32}{sizes[-1]:5} functions{walls[-1]:8.1f} s  cpu {cpus[-1]:7.1f} s"
              f"{one.peak_MiB:7.0f} MiB", flush=True)  # fmt: skip
    for what, times in (("wall", walls), ("processor", cpus)):
        print(f"exponent of {what} time: {np.polyfit(np.log(sizes), np.log(times), 1)[0]:.2f}")


def force_field(smiles: str) -> str:
    """XYZ text of a force-field structure: good enough to time."""
    from rdkit import Chem
    from rdkit.Chem import AllChem

    molecule = Chem.AddHs(Chem.MolFromSmiles(smiles))
    AllChem.EmbedMolecule(molecule, randomSeed=7)
    AllChem.UFFOptimizeMolecule(molecule, maxIters=2000)
    return str(Chem.MolToXYZBlock(molecule))


def floor(path: str) -> None:
    """Time of every stage of one SCF, without stability test, over the time of its multiplications alone."""
    from unpaired.electronic import fitting, grid
    from unpaired.electronic.meanfield import mean_field
    from unpaired.electronic.mole import build_mole
    from unpaired.electronic.settings import settings as settings_of
    from unpaired.level import Level
    from unpaired.molecule import Molecule
    from unpaired.point import Point
    from unpaired.structures.file import read_structure

    seconds: dict[str, float] = defaultdict(float)
    work: dict[str, NDArray[np.float64]] = defaultdict(lambda: np.zeros(2))
    calls: dict[str, int] = defaultdict(int)

    def watch(where: Any, name: str, stage: str, count: Callable[..., tuple[float, float]]) -> None:
        """Add up the time of a function and its operations in double and in single precision."""
        inner = getattr(where, name)

        @functools.wraps(inner)
        def outer(*arguments: Any, **options: Any) -> Any:
            started = time.perf_counter()
            answer = inner(*arguments, **options)
            seconds[stage] += time.perf_counter() - started
            work[stage] += count(*arguments)
            calls[stage] += 1
            return answer

        setattr(where, name, outer)

    def either(single: bool, flop: float) -> tuple[float, float]:
        return (0.0, flop) if single else (flop, 0.0)

    def half(integrals: Any, columns: int) -> float:
        elements = sum(c.functions.size * c.partners.size for c in integrals.clusters)
        return 2.0 * len(integrals.packed) * elements * columns

    def whole(integrals: Any, factors: Any, kind: Any = np.float64) -> tuple[float, float]:
        columns = sum(n.size for _, n in factors)
        second = float(len(integrals.packed) * integrals.size**2 * columns)
        return either(kind == np.float32, half(integrals, columns) + second)

    def anchor(integrals: Any, orbitals: Any) -> tuple[float, float]:
        return whole(integrals, [(c, c[0]) for c in orbitals])

    def near(this: Any, integrals: Any, steps: Any) -> tuple[float, float]:
        counts = [step.shape[1] for step in steps]
        second = 8.0 * len(integrals.packed) * integrals.size * sum(n**2 for n in counts)
        return 0.0, half(integrals, sum(counts)) + second

    def density(blocks: Any, factors: Any, kind: str) -> tuple[float, float]:
        columns = sum(n.size for _, n in factors)
        flop = float(sum(8 * columns * b.functions.size * (b.stop - b.start) for b in blocks.blocks))
        return either(blocks.kind == np.float32, flop)

    def matrices(blocks: Any, potential: Any, kind: Any = np.float64) -> tuple[float, float]:
        flop = float(sum(4 * b.functions.size**2 * (b.stop - b.start) for b in blocks.blocks))
        return either(np.float32 in (blocks.kind, kind), flop)

    def nothing(*_: Any) -> tuple[float, float]:
        return 0.0, 0.0

    rates = np.array([multiplication_rate(np.float64), multiplication_rate(np.float32)])
    geometry = read_structure(path)
    level = Level("UKS", "pcH-1", "B3LYP")
    point = Point(Molecule(geometry.elements, geometry.coordinates_bohr, 0, 2), level)
    mole = build_mole(point)
    field = mean_field(mole, level, None, settings_of(level))
    watch(fitting, "three_index", "three-index integrals", nothing)
    watch(fitting, "coulomb", "Coulomb", lambda all_, dm: (4.0 * len(dm) * all_.packed.size, 0.0))
    watch(fitting, "whole", "exchange, rough stage", whole)
    watch(fitting, "anchor", "exchange, anchors", anchor)
    watch(fitting.Anchor, "near", "exchange, near anchors", near)
    watch(grid.Blocks, "__init__", "function values on grids", nothing)
    watch(grid, "_density", "density on grids", density)
    watch(grid, "_matrices", "potential matrices", matrices)
    watch(grid.GridIntegration, "eval_xc_eff", "functional on grids", nothing)
    watch(type(field), "eig", "diagonalisation", lambda *_: (2 * 9.0 * mole.nao**3, 0.0))
    started = time.perf_counter()
    field.kernel()
    total = time.perf_counter() - started
    print(f"{path} UKS-B3LYP/pcH-1, {mole.nao} functions; matrix multiplication {rates[0] / 1e9:.1f} Gflop/s "
          f"in double, {rates[1] / 1e9:.1f} in single precision")  # fmt: skip
    print(f"{'stage':30}{'calls':>6}{'s':>8}{'Gflop':>9}{'single':>9}{'floor s':>9}{'ratio':>7}")
    for stage in sorted(seconds, key=lambda name: -seconds[name]):
        print(f"{stage:30}{calls[stage]:6}" + _line(seconds[stage], work[stage], rates))
    everything = np.sum(list(work.values()), axis=0)
    print(f"{'all, with what is not listed':36}" + _line(total, everything, rates))


def _line(seconds: float, work: NDArray[np.float64], rates: NDArray[np.float64]) -> str:
    """Time, operations in double and single precision, the time of these at the rates, and the ratio."""
    least = float((work / rates).sum())
    ratio = f"{seconds / least:7.1f}" if least else ""
    return f"{seconds:8.2f}{work[0] / 1e9:9.1f}{work[1] / 1e9:9.1f}{least:9.2f}{ratio}"


def multiplication_rate(kind: Any) -> float:
    """Flop/s of a large matrix product, best of five."""
    left = np.random.default_rng(0).normal(size=(1500, 1500)).astype(kind)
    times = []
    for _ in range(5):
        started = time.perf_counter()
        left @ left
        times.append(time.perf_counter() - started)
    return 2 * 1500**3 / min(times)


if __name__ == "__main__":
    tasks: dict[str, Callable[..., None]] = {
        "race": race, "levels": levels, "settings": settings, "growth": growth, "floor": floor,
    }  # fmt: skip
    if len(sys.argv) < 2 or sys.argv[1] not in tasks:
        raise SystemExit(__doc__)
    tasks[sys.argv[1]](*sys.argv[2:])
