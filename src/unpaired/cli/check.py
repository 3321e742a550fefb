"""unpaired check: what a run would do, without doing it."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer


def check(
    recipes: Annotated[list[Path], typer.Argument(metavar="RECIPE...", help="Recipe files.")],
) -> None:
    """Validate recipes and say what would run: atoms, electrons, basis functions, memory, time."""
    from ..forecast import forecast_report
    from ..recipe.load import load_recipes

    typer.echo(forecast_report(load_recipes(recipes)), nl=False)
