"""What `unpaired` costs beyond the self-consistent field, and how soon it answers.

    python tests/benchmarks/overhead.py

prints the share of our own time for benzyl UKS-B3LYP/pcH-1 (everything of a run but `solve`), the time of
`unpaired --help`, and the time of a second run of every shipped recipe, where all is in the store.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from pathlib import Path

ROOT = Path(__file__).parents[2]


def command_s(*arguments: str) -> float:
    """Wall time of an `unpaired` command, best of three."""
    times = []
    for _ in range(3):
        started = time.perf_counter()
        subprocess.run([sys.executable, "-m", "unpaired", *arguments], check=True, stdout=subprocess.DEVNULL)
        times.append(time.perf_counter() - started)
    return min(times)


def benzyl_share(out: Path) -> tuple[float, float]:
    """Seconds in solve, and seconds of the whole command beyond it."""
    recipe = out / "benzyl.yaml"
    recipe.write_text(
        f"radical: benzyl\nstructure: {ROOT / 'molecules' / 'benzyl.xyz'}\n"
        "levels: [{scf: UKS, functional: B3LYP, basis: pcH-1}]\n"
    )
    started = time.perf_counter()
    subprocess.run(
        [sys.executable, "-m", "unpaired", "run", str(recipe), "--out", str(out / "results")],
        check=True,
        stdout=subprocess.DEVNULL,
    )
    whole_s = time.perf_counter() - started
    from unpaired import load_result

    solve_s = load_result(out / "results" / "benzyl").rows("states")[0]["wall_s"]
    return solve_s, whole_s - solve_s


def main() -> None:
    """Measure and print."""
    print(f"unpaired --help                       {command_s('--help'):8.2f} s")
    with tempfile.TemporaryDirectory() as place:
        solve_s, own_s = benzyl_share(Path(place))
        print(f"benzyl UKS-B3LYP/pcH-1, solve         {solve_s:8.2f} s")
        print(
            f"  beyond it, with start of Python     {own_s:8.2f} s  {100 * own_s / (solve_s + own_s):.1f} %"
        )
    with tempfile.TemporaryDirectory() as place:
        for recipe in sorted((ROOT / "recipes").glob("*.yaml")):
            arguments = ("run", str(recipe), "--out", place)
            subprocess.run(
                [sys.executable, "-m", "unpaired", *arguments], check=False, stdout=subprocess.DEVNULL
            )
            print(f"second run of {recipe.stem:24}{command_s(*arguments):8.2f} s")


if __name__ == "__main__":
    main()
