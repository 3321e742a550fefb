"""unpaired table: finished runs as one tidy table."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Annotated

import typer

from .choices import Results


def table(
    results: Results,
    of: Annotated[str, typer.Option("--of", help="Which table: couplings, states, flags, ...")] = "couplings",
    format: Annotated[str | None, typer.Option(help="csv, markdown, json or parquet.")] = None,
    output: Annotated[Path | None, typer.Option(help="File to write; its ending tells the format.")] = None,
) -> None:
    """Collect finished runs into one tidy table."""
    from ..columns import names
    from ..errors import InputError, require_choice
    from ..files import write_atomically
    from ..result import load_result
    from ..tables import FORMATS, collect

    endings = {".csv": "csv", ".md": "markdown", ".json": "json", ".parquet": "parquet"}
    form = format or (endings.get(output.suffix.lower()) if output else "csv")
    if form is None:
        raise InputError(f"{output}: the ending tells no format; use {', '.join(endings)} or give --format")
    require_choice("--format", form, tuple(FORMATS))
    if form == "parquet" and output is None:
        raise InputError("--format parquet: is not text, give --output FILE.parquet")
    rows = collect([load_result(path) for path in results], of)
    content = FORMATS[form](rows, names(of))
    if output is not None:
        write_atomically(output, content)
    else:
        sys.stdout.write(str(content))
