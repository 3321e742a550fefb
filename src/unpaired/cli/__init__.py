"""The command line: one file per command; here they are put together and their errors become exit statuses.

A command is a function with a docstring, typed for typer. It imports what it needs when it runs, raises
UnpairedError for everything that goes wrong on purpose, and `typer.Exit(1)` if a level failed.
"""

from __future__ import annotations

import functools
import os
import sys
from collections.abc import Callable, Sequence
from typing import ParamSpec

import typer

from ..errors import CalculationError, UnpairedError
from .check import check
from .contrast import contrast
from .density import density
from .export import export
from .nuclei import nuclei
from .run import run
from .spectrum import spectrum
from .structure import structure
from .table import table

_Parameters = ParamSpec("_Parameters")

SOME_FAILED, REFUSED, INTERRUPTED = 1, 2, 130
"""Exit statuses; 0 if everything ran."""

app = typer.Typer(
    help="Hyperfine couplings of radicals: predicted, judged and put into tables.",
    no_args_is_help=True,
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
)


@app.callback()
def _several_commands() -> None:
    """Keeps the name of the command necessary, however many commands there are."""


def _with_exit_status(command: Callable[_Parameters, None]) -> Callable[_Parameters, None]:
    """The command, with every error that was raised on purpose said in one go and turned into a status."""

    @functools.wraps(command)
    def run(*arguments: _Parameters.args, **options: _Parameters.kwargs) -> None:
        try:
            command(*arguments, **options)
            sys.stdout.flush()
        except UnpairedError as error:
            print(error.message, file=sys.stderr)
            raise typer.Exit(SOME_FAILED if isinstance(error, CalculationError) else REFUSED) from None
        except KeyboardInterrupt:
            print("interrupted", file=sys.stderr)
            raise typer.Exit(INTERRUPTED) from None
        except BrokenPipeError:
            # The reader of the pipe has seen enough. Python's own flush at the end must not fail on it again.
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())

    return run


for _command in (run, check, table, contrast, density, structure, spectrum, export, nuclei):
    app.command()(_with_exit_status(_command))


def main(arguments: Sequence[str] | None = None) -> None:
    """Run the command line and leave with its exit status."""
    app(None if arguments is None else list(arguments), prog_name="unpaired")
