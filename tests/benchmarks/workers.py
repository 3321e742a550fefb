"""Two workers with one thread each against one worker with two threads, over all shipped recipes; the store.

    python tests/benchmarks/workers.py [--recipes recipes/methyl.yaml ...]

prints both wall times and their ratio, the cost of storing and finding one point, and the time of one table
over a thousand results.
"""

from __future__ import annotations

import argparse
import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

ROOT = Path(__file__).parents[2]
sys.path.insert(0, str(ROOT / "tests"))


def run_s(recipes: list[str], out: str, workers: int, threads: int) -> float:
    """Wall time of one cold run."""
    started = time.perf_counter()
    subprocess.run(
        [sys.executable, "-m", "unpaired", "run", *recipes, "--out", out, "--workers", str(workers)],
        env=os.environ | {"OMP_NUM_THREADS": str(threads)},
        stdout=subprocess.DEVNULL,
        check=False,
    )
    return time.perf_counter() - started


def store_ms(out: Path) -> tuple[float, float]:
    """Milliseconds to save and to load a state of 245 basis functions (benzyl in pcH-1)."""
    import numpy as np
    from samples import hydrogen, identity

    from unpaired.state import Solution, State
    from unpaired.store import Store

    functions = 245
    random = np.random.default_rng(1)
    solution = Solution(
        -270.0,
        0.78,
        True,
        "",
        "made up",
        random.normal(size=(2, functions, functions)),
        np.ones((2, functions)),
        np.ones((2, functions)),
    )
    state = State((solution,), 0, np.eye(functions), np.ones((14, functions)), 9, 1.0)
    store = Store(out, identity)
    points = [hydrogen(float(number)) for number in range(20)]
    started = time.perf_counter()
    for point in points:
        store.save(point, state)
    saved = time.perf_counter()
    for point in points:
        store.load(point)
    return 1e3 * (saved - started) / len(points), 1e3 * (time.perf_counter() - saved) / len(points)


def table_s(out: Path) -> float:
    """Seconds for one table over a thousand results, whole command."""
    from samples import result

    from unpaired import tables

    folders = [str(tables.write_result(result(f"radical-{number}"), out)) for number in range(1000)]
    started = time.perf_counter()
    subprocess.run(
        [sys.executable, "-m", "unpaired", "table", *folders], stdout=subprocess.DEVNULL, check=True
    )
    return time.perf_counter() - started


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawTextHelpFormatter)
    parser.add_argument("--recipes", nargs="*", default=sorted(map(str, (ROOT / "recipes").glob("*.yaml"))))
    recipes = parser.parse_args().recipes
    with tempfile.TemporaryDirectory() as place:
        saved_ms, loaded_ms = store_ms(Path(place))
        print(f"store, 245 basis functions: save {saved_ms:.1f} ms, load {loaded_ms:.1f} ms per point")
    with tempfile.TemporaryDirectory() as place:
        print(f"table over 1000 results: {table_s(Path(place)):.2f} s")
    with tempfile.TemporaryDirectory() as place:
        one_s = run_s(recipes, f"{place}/one", workers=1, threads=2)
        two_s = run_s(recipes, f"{place}/two", workers=2, threads=2)
        print(
            f"{len(recipes)} recipes: one worker with two threads {one_s:.0f} s, two workers with one thread each "
            f"{two_s:.0f} s, ratio {one_s / two_s:.2f}"
        )


if __name__ == "__main__":
    main()
