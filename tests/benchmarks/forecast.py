"""What `unpaired check` expects of every level against what the level takes, each in a process of its own.

    python tests/benchmarks/forecast.py [recipes/methyl.yaml ...]

prints expected and measured memory and time and their ratios, and the largest of each.
"""

from __future__ import annotations

import multiprocessing
import sys
import time
from multiprocessing.queues import Queue
from pathlib import Path

from unpaired.electronic.cost import estimate
from unpaired.point import Point
from unpaired.recipe.load import load_recipe
from unpaired.study import plan

ROOT = Path(__file__).parents[2]
sys.path.insert(0, str(ROOT / "tests"))


def measure(point: Point, answer: Queue[tuple[float, int]]) -> None:
    """Wall time of solve and peak memory of the process."""
    from peak import peak_bytes

    from unpaired.electronic.solve import solve

    started = time.perf_counter()
    solve(point)
    answer.put((time.perf_counter() - started, peak_bytes()))


def main() -> None:
    """Measure and print."""
    paths = sys.argv[1:] or sorted(map(str, (ROOT / "recipes").glob("*.yaml")))
    context = multiprocessing.get_context("spawn")
    times, memories = [], []
    print(
        f"{'level':44}{'MiB expected':>13}{'used':>7}{'ratio':>7}{'s expected':>12}{'taken':>8}{'ratio':>7}"
    )
    for path in paths:
        planned = plan(load_recipe(path))
        for point in planned.points:
            expected = estimate(point)
            answer: Queue[tuple[float, int]] = context.Queue()
            process = context.Process(target=measure, args=(point, answer))
            process.start()
            process.join()
            name = f"{planned.recipe.radical} {point.level.id}"
            if answer.empty():
                print(f"{name:44} failed")
                continue
            seconds, peak = answer.get()
            memories.append(expected.memory_bytes / peak)
            times.append(expected.seconds / seconds)
            print(
                f"{name:44}{expected.memory_bytes / 2**20:13.0f}{peak / 2**20:7.0f}{memories[-1]:7.2f}"
                f"{expected.seconds:12.1f}{seconds:8.1f}{times[-1]:7.2f}"
            )
    print(f"memory: expected over used from {min(memories):.2f} to {max(memories):.2f}")
    print(f"time: expected over taken from {min(times):.2f} to {max(times):.2f}")


if __name__ == "__main__":
    main()
