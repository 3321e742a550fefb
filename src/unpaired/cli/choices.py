"""Options that several commands read in the same way."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Annotated

import typer

Results = Annotated[list[Path], typer.Argument(metavar="RESULT...", help="Folders that runs left.")]
LevelId = Annotated[str | None, typer.Option(help="Level id; default: the last of each recipe.")]
GFactor = Annotated[
    float | None, typer.Option("--g", help="g; default: the measured one of the recipe, else g_e.")
]
NamedIsotopes = Annotated[
    list[str] | None,
    typer.Option(metavar="ATOM=ISOTOPE", help="Such as C1=13C, or H=2H for all; may be repeated."),
]
Satellites = Annotated[
    float | None, typer.Option(metavar="SHARE", help="Keep natural isotopologues down to this share.")
]
WhichCoupling = Annotated[str, typer.Option(help="averaged (where the result has it) or equilibrium.")]


def isotope_labels(texts: Sequence[str] | None) -> dict[str, str]:
    """`["C1=13C"]` as {"C1": "13C"}. Raises InputError for any other form."""
    from ..errors import InputError

    labels = {}
    for text in texts or []:
        atom, equals, name = text.partition("=")
        if not (atom and equals and name):
            raise InputError(f'--isotope: "{text}" is not of the form ATOM=ISOTOPE, such as C1=13C')
        labels[atom] = name
    return labels
