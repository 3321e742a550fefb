"""Kill `unpaired run` at random moments, run it again, and compare with a run that nobody disturbed.

    python tests/killing.py --kills 200

prints, at the end, how many kills hit, how many points were finished by then, and whether the tables are the
same to the last digit. The quick suite's slow part does the same with 20 kills.
"""

from __future__ import annotations

import argparse
import csv
import os
import random
import shutil
import signal
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

RADICALS = {
    "atom": ("H 0 0 0", "charge: 0"),
    "helium": ("He 0 0 0", "charge: 1"),
    "hydride": ("O 0 0 0\nH 0 0 0.97", "charge: 0"),
    "amidogen": ("N 0 0 0\nH 0 0.80 0.60\nH 0 -0.80 0.60", "charge: 0"),
    "methyl": ("C 0 0 0\nH 1.079 0 0\nH -0.5395 0.934441 0\nH -0.5395 -0.934441 0", "charge: 0"),
}
TABLES = ("couplings.csv", "states.csv", "flags.csv")


@dataclass(frozen=True)
class Outcome:
    """What the kills did."""

    kills_that_hit: int
    points_at_end: int
    computed_again: int
    differing_tables: tuple[str, ...]


def write_recipes(folder: Path) -> list[Path]:
    """Five small recipes with two levels each."""
    recipes = []
    for name, (atoms, charge) in RADICALS.items():
        lines = atoms.splitlines()
        (folder / f"{name}.xyz").write_text(f"{len(lines)}\nby hand\n{atoms}\n")
        recipe = folder / f"{name}.yaml"
        recipe.write_text(
            f"radical: {name}\nstructure: {name}.xyz\n{charge}\n"
            "levels:\n  - {scf: UHF, basis: pcH-1}\n  - {scf: ROHF, basis: pcH-1}\n"
        )
        recipes.append(recipe)
    return recipes


def start(recipes: list[Path], out: Path) -> subprocess.Popen[bytes]:
    """`unpaired run` with two workers in a process group of its own."""
    command = [
        sys.executable,
        "-m",
        "unpaired",
        "run",
        *map(str, recipes),
        "--out",
        str(out),
        "--workers",
        "2",
    ]
    return subprocess.Popen(
        command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, start_new_session=True
    )


def finished(out: Path) -> dict[str, int]:
    """Key and inode of every whole entry of the store: computing it again would change the inode."""
    return {path.parent.name: path.stat().st_ino for path in (out / ".store").glob("*[0-9a-f]/state.json")}


def tables(out: Path) -> dict[str, list[dict[str, str]]]:
    """Every table of every radical, without the wall time, which no two runs share."""
    found = {}
    for name in RADICALS:
        for table in TABLES:
            with (out / name / table).open(newline="") as file:
                found[f"{name}/{table}"] = [
                    {key: value for key, value in row.items() if key != "wall_s"}
                    for row in csv.DictReader(file)
                ]
    return found


def kill_and_compare(folder: Path, kills: int, seed: int) -> Outcome:
    """Run undisturbed; then kill at `kills` random moments, starting afresh whenever a run gets through."""
    recipes = write_recipes(folder)
    undisturbed = folder / "undisturbed"
    began = time.monotonic()
    if start(recipes, undisturbed).wait() != 0:
        raise RuntimeError("the undisturbed run failed")
    length_s = time.monotonic() - began
    wanted = tables(undisturbed)

    chance = random.Random(seed)
    out = folder / "killed"
    hits, again = 0, 0
    differing: set[str] = set()
    for _ in range(kills):
        before = finished(out)
        process = start(recipes, out)
        time.sleep(chance.uniform(0.0, length_s))
        if process.poll() is None:
            os.killpg(process.pid, signal.SIGKILL)
            hits += 1
        process.wait()
        after = finished(out)
        again += sum(after.get(key) != inode for key, inode in before.items())
        if len(after) == len(finished(undisturbed)):
            differing |= finish_and_compare(recipes, out, wanted)
            shutil.rmtree(out)
    differing |= finish_and_compare(recipes, out, wanted)
    return Outcome(hits, len(finished(out)), again, tuple(sorted(differing)))


def finish_and_compare(recipes: list[Path], out: Path, wanted: dict[str, list[dict[str, str]]]) -> set[str]:
    """Run to the end and name the tables that differ from the undisturbed ones."""
    if start(recipes, out).wait() != 0:
        return {"the run after the kill failed"}
    found = tables(out)
    return {name for name in wanted if found[name] != wanted[name]}


if __name__ == "__main__":
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawTextHelpFormatter)
    parser.add_argument("--kills", type=int, default=200)
    parser.add_argument("--seed", type=int, default=1)
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as place:
        print(kill_and_compare(Path(place), options.kills, options.seed))
