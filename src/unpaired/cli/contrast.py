"""unpaired contrast: levels side by side, group by group."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Annotated

import typer

from .choices import Results


def contrast(
    results: Results,
    output: Annotated[
        Path | None, typer.Option(help="File: .csv (tidy table), .svg or .png (plot). Default: print.")
    ] = None,
) -> None:
    """Compare levels per group: ROHF, projected UHF, UHF, ROKS, UKS, direct part, polarisation, measured."""
    from ..contrast import COLUMNS, contrast_report, tidy_rows
    from ..contrast import contrast as compare
    from ..errors import InputError
    from ..files import write_atomically
    from ..result import load_result
    from ..tables import as_csv

    ending = output.suffix.lower() if output else ""
    if output and ending not in (".csv", ".svg", ".png"):
        raise InputError(
            f"{output}: the ending tells no form; use .csv for the table, .svg or .png for the plot"
        )
    found = compare([load_result(path) for path in results], [str(path) for path in results])
    if output is None:
        sys.stdout.write(contrast_report(found))
    elif ending == ".csv":
        write_atomically(output, as_csv(tidy_rows(found), COLUMNS))
    else:
        from ..figures.contrast import contrast_figure

        write_atomically(output, contrast_figure(found, ending[1:]))
