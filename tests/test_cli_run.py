"""The commands run, check and table as a user types them: what they print, write and return."""

from __future__ import annotations

import csv
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from unpaired.cli import main
from unpaired.errors import ConvergenceError

HYDROGEN = (
    "radical: hydrogen\nstructure: h.xyz\nlevels: [{scf: UHF, basis: pcH-1}, {scf: ROHF, basis: pcH-1}]\n"
)


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    (tmp_path / "h.xyz").write_text("1\nby hand\nH 0 0 0\n")
    (tmp_path / "h.yaml").write_text(HYDROGEN)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def unpaired(*arguments: str) -> int:
    """Exit status of a command run in this process."""
    with pytest.raises(SystemExit) as ended:
        main(arguments)
    return int(ended.value.code or 0)


def read_csv(path: Path) -> list[dict[str, str]]:
    return list(csv.DictReader(path.read_text().splitlines()))


def test_a_run_prints_couplings_and_leaves_its_folder(folder: Path, capsys) -> None:
    assert unpaired("run", "h.yaml") == 0
    printed = capsys.readouterr()
    assert "+49.902 (+1398.5)" in printed.out  # 1.7 % below the exact 1422.8 MHz: pcH-1
    assert printed.err == ""
    rows = read_csv(folder / "results/hydrogen/couplings.csv")
    assert [row["level"] for row in rows] == ["UHF/pcH-1", "ROHF/pcH-1"]


def test_a_second_run_computes_nothing(folder: Path, capsys, monkeypatch: pytest.MonkeyPatch) -> None:
    assert unpaired("run", "h.yaml") == 0
    first = capsys.readouterr().out
    monkeypatch.setattr("unpaired.electronic.solve.solve", None)
    assert unpaired("run", "h.yaml") == 0
    assert capsys.readouterr().out == first


def test_a_failed_level_is_said_and_gives_status_one(folder: Path, capsys, monkeypatch) -> None:
    from unpaired.electronic.solve import solve

    def moody(point, report=None):
        if point.level.scf == "ROHF":
            raise ConvergenceError("no state found")
        return solve(point, report)

    monkeypatch.setattr("unpaired.electronic.solve.solve", moody)
    assert unpaired("run", "h.yaml") == 1
    printed = capsys.readouterr()
    assert "hydrogen ROHF/pcH-1: no state found; " in printed.err
    assert "+49.902" in printed.out
    states = read_csv(folder / "results/hydrogen/states.csv")
    assert [(row["converged"], row["flags"]) for row in states] == [
        ("true", states[0]["flags"]),
        ("false", "not-converged"),
    ]


def test_one_bad_recipe_stops_all_before_anything_runs(folder: Path, capsys) -> None:
    (folder / "bad.yaml").write_text("radical: bad\nstructur: h.xyz\n")
    assert unpaired("run", "h.yaml", "bad.yaml") == 2
    printed = capsys.readouterr()
    assert "bad.yaml:2: structur: " in printed.err
    assert printed.out == ""
    assert not (folder / "results").exists()


def test_a_folder_that_cannot_be_written_is_refused(folder: Path, capsys) -> None:
    (folder / "file").write_text("")
    assert unpaired("run", "h.yaml", "--out", "file/below") == 2
    assert "results cannot be written there" in capsys.readouterr().err


def test_too_little_memory_is_refused_with_what_to_change(folder: Path, capsys, monkeypatch) -> None:
    monkeypatch.setattr("unpaired.machine.memory_bytes", lambda: 1000)
    assert unpaired("run", "h.yaml") == 2
    assert "take a smaller basis set than pcH-1" in capsys.readouterr().err


def test_check_says_what_would_run_and_runs_nothing(folder: Path, capsys) -> None:
    assert unpaired("check", "h.yaml") == 0
    head, first, second, total, how = capsys.readouterr().out.splitlines()
    assert head.split()[:4] == ["radical", "level", "atoms", "electrons"]
    assert first.split()[:7] == ["hydrogen", "UHF/pcH-1", "1", "1", "0", "2", "10"]
    assert second.split()[1] == "ROHF/pcH-1"
    assert total.startswith("2 points")
    assert how.startswith("times: from a multiplication of matrices timed just now")
    assert not (folder / "results").exists()


@pytest.mark.parametrize("form", ["csv", "markdown", "json"])
def test_table_prints_what_pipes_can_take(folder: Path, capsys, form: str) -> None:
    unpaired("run", "h.yaml")
    capsys.readouterr()
    assert unpaired("table", "results/hydrogen", "--of", "states", "--format", form) == 0
    assert "ROHF/pcH-1" in capsys.readouterr().out


def test_table_writes_by_ending(folder: Path, capsys) -> None:
    unpaired("run", "h.yaml")
    assert unpaired("table", "results/hydrogen", "--output", "all.parquet") == 0
    assert (folder / "all.parquet").read_bytes()[:4] == b"PAR1"


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        (("table", "nowhere"), "give a folder that `unpaired run` left"),
        (("table", "results/hydrogen", "--of", "energies"), 'table "energies" does not exist'),
        (("table", "results/hydrogen", "--format", "cvs"), 'did you mean "csv"?'),
        (("table", "results/hydrogen", "--format", "parquet"), "give --output FILE.parquet"),
        (("table", "results/hydrogen", "--output", "x.doc"), "the ending tells no format"),
        (("run", "nothing.yaml"), "nothing.yaml"),
    ],
)
def test_bad_input_gives_one_sentence_and_status_two(folder: Path, capsys, arguments, sentence: str) -> None:
    unpaired("run", "h.yaml")
    capsys.readouterr()
    assert unpaired(*arguments) == 2
    printed = capsys.readouterr()
    assert sentence in printed.err
    assert "Traceback" not in printed.err


def test_two_recipes_with_one_name_are_refused(folder: Path, capsys) -> None:
    (folder / "other.yaml").write_text(HYDROGEN)
    assert unpaired("run", "h.yaml", "other.yaml") == 2
    assert "has the same name" in capsys.readouterr().err


@pytest.mark.slow
def test_ctrl_c_leaves_finished_levels_and_status_130(folder: Path) -> None:
    """The second level is large enough to be still running when the interrupt comes."""
    (folder / "c.xyz").write_text("3\nby hand\nN 0 0 0\nH 0 0.80 0.60\nH 0 -0.80 0.60\n")
    (folder / "long.yaml").write_text(
        "radical: long\nstructure: c.xyz\nlevels:\n  - {scf: UHF, basis: pcH-1}\n"
        "  - {scf: UKS, functional: B3LYP, basis: pcH-3, accuracy: reference}\n"
    )
    process = subprocess.Popen(
        [sys.executable, "-m", "unpaired", "run", "long.yaml"], stderr=subprocess.PIPE, text=True, cwd=folder,
        # a shell that starts the tests in the background has its children ignore the keyboard
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.SIG_DFL),
    )  # fmt: skip
    patience = time.monotonic() + 120
    while not list((folder / "results").glob(".store/*/state.json")) and time.monotonic() < patience:
        time.sleep(0.05)
    os.kill(process.pid, signal.SIGINT)
    _, said = process.communicate(timeout=60)
    assert process.returncode == 130
    assert "Traceback" not in said
    states = read_csv(folder / "results/long/states.csv")
    assert [(row["converged"], row["flags"].split(";")[0]) for row in states[1:]] == [
        ("false", "interrupted")
    ]
    assert states[0]["converged"] == "true"


def test_help_names_every_command(capsys) -> None:
    assert unpaired("--help") == 0
    printed = capsys.readouterr().out
    assert all(f"  {command} " in printed for command in ("run", "check", "table", "nuclei"))


def test_help_loads_nothing_heavy() -> None:
    """Half a second is kept by what is not imported (a timed test would fail on a busy machine)."""
    code = "import sys; import unpaired.cli; print([m for m in ('numpy', 'pandas', 'pyscf') if m in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
