"""unpaired run: every level of every recipe, tables printed and written."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer


def run(
    recipes: Annotated[list[Path], typer.Argument(metavar="RECIPE...", help="Recipe files.")],
    out: Annotated[
        Path, typer.Option(help="Folder for results; finished levels in it are not run again.")
    ] = Path("results"),
    workers: Annotated[int, typer.Option(min=1, help="Levels computed side by side.")] = 1,
) -> None:
    """Run every level of every recipe, print couplings and states, and write tables."""
    from ..campaign import Campaign
    from .progress import Progress

    with Progress() as progress:
        campaign = Campaign(recipes, out, workers, progress)
        failures = campaign.run(print_result=progress.print)
    if failures:
        typer.echo(failures, err=True)
        raise typer.Exit(1)
