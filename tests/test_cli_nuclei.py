"""`unpaired nuclei` as it is typed and piped, and the exit statuses that all commands share."""

from __future__ import annotations

import os
import signal
import subprocess
import sys

import pytest
import typer
from typer.testing import CliRunner

from unpaired.cli import _with_exit_status, app
from unpaired.errors import ConvergenceError, InputError, StoreError, UnpairedError
from unpaired.nuclei import all_isotopes

RUNNER = CliRunner()


def _command(*arguments: str, **options: object) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "unpaired", *arguments], capture_output=True, text=True, check=False, **options
    )


def test_one_isotope_in_one_line() -> None:
    run = _command("nuclei", "c13")
    heading, line = run.stdout.splitlines()
    assert heading.split() == [
        *("isotope", "spin", "nuclear_g", "abundance", "coupling_per_density_MHz", "coupling_per_density_mT"),
        *("quadrupole_barn", "source"),
    ]
    # 800.2374068 * 1.404738 MHz and that over 28.0249514, by hand (constants: physics notes, section 1).
    assert line.split()[:7] == ["13C", "1/2", "1.404738", "0.0107", "1124.1239", "40.11154", "-"]
    assert (run.returncode, run.stderr) == (0, "")


def test_without_arguments_all_of_them_in_order_and_whole() -> None:
    run = RUNNER.invoke(app, ["nuclei"])
    lines = run.stdout.splitlines()[1:]
    assert [line.split()[0] for line in lines] == [item.name for item in all_isotopes()]
    assert all(line.endswith(item.source) for line, item in zip(lines, all_isotopes(), strict=True))


def test_isotopes_come_in_the_order_asked_for() -> None:
    run = RUNNER.invoke(app, ["nuclei", "14N", "1H"])
    assert [line.split()[0] for line in run.stdout.splitlines()[1:]] == ["14N", "1H"]


def test_output_for_a_pipe_has_no_colour_and_is_not_cut() -> None:
    run = _command("nuclei", "33S", env={**os.environ, "COLUMNS": "40"})
    assert "\x1b" not in run.stdout
    assert len(run.stdout.splitlines()) == 2
    assert "from memory" in run.stdout


def test_an_unknown_isotope_is_one_sentence_and_status_2() -> None:
    run = _command("nuclei", "13C", "13X")
    assert run.returncode == 2
    assert run.stdout == ""
    assert run.stderr == (
        'isotope "13X" does not exist; did you mean "13C"? (mass number and element, such as 13C)\n'
    )


def test_a_reader_that_has_seen_enough_is_no_failure() -> None:
    command = f"set -o pipefail; {sys.executable} -m unpaired nuclei | head -n 1"
    run = subprocess.run(["bash", "-c", command], capture_output=True, text=True, check=False)
    assert (run.returncode, run.stderr) == (0, "")


def _invoke(error: BaseException) -> tuple[int, str]:
    """Exit status and standard error of a command that ends in this error."""
    one = typer.Typer()

    def fail() -> None:
        raise error

    one.command()(_with_exit_status(fail))
    run = RUNNER.invoke(one, [])
    return run.exit_code, run.stderr


@pytest.mark.parametrize(
    ("error", "status"),
    [(InputError("bad"), 2), (StoreError("bad"), 2), (ConvergenceError("bad"), 1), (UnpairedError("bad"), 2)],
)
def test_errors_raised_on_purpose_become_a_sentence_and_a_status(error: UnpairedError, status: int) -> None:
    assert _invoke(error) == (status, "bad\n")


def test_an_interrupt_leaves_with_130() -> None:
    assert _invoke(KeyboardInterrupt()) == (130, "interrupted\n")


def test_an_unforeseen_error_is_not_hidden() -> None:
    one = typer.Typer()

    def fail() -> None:
        raise ZeroDivisionError

    one.command()(_with_exit_status(fail))
    assert isinstance(RUNNER.invoke(one, []).exception, ZeroDivisionError)


def test_a_signal_from_the_keyboard_ends_a_command_with_130() -> None:
    """A real SIGINT to a real process, as Ctrl-C sends it."""
    code = (
        "import signal, time, typer\n"
        # a shell that starts the tests in the background has its children ignore the keyboard
        "signal.signal(signal.SIGINT, signal.default_int_handler)\nfrom unpaired.cli import _with_exit_status\n"
        "def wait() -> None:\n    print('ready', flush=True)\n    time.sleep(60)\n"
        "app = typer.Typer()\napp.command()(_with_exit_status(wait))\napp([])"
    )
    with subprocess.Popen(
        [sys.executable, "-c", code], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    ) as process:
        assert process.stdout is not None
        assert process.stderr is not None
        assert process.stdout.readline() == "ready\n"
        process.send_signal(signal.SIGINT)
        assert process.wait(timeout=20) == 130
        assert process.stderr.read() == "interrupted\n"


def test_an_unknown_command_is_status_2() -> None:
    assert _command("nucleii").returncode == 2


def test_help_loads_nothing_heavy() -> None:
    code = (
        "import sys\nfrom unpaired.cli import main\n"
        "try:\n    main(['--help'])\nexcept SystemExit:\n    pass\n"
        "heavy = {'numpy', 'scipy', 'pandas', 'pyscf', 'matplotlib', 'rdkit', 'yaml', 'rich.console'}\n"
        "print('loaded', sorted(heavy & set(sys.modules)))"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.splitlines()[-1] == "loaded []"


def test_help_takes_under_half_a_second() -> None:
    """Processor time of the quickest of three, so that a busy machine does not decide (design, section 4)."""

    def seconds() -> float:
        before = os.times()
        _command("--help")
        after = os.times()
        return after.children_user + after.children_system - before.children_user - before.children_system

    assert min(seconds() for _ in range(3)) < 0.5
