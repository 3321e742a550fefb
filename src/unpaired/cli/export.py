"""unpaired export: the couplings of finished runs as a spin-system file."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from .choices import GFactor, LevelId, NamedIsotopes, Results, Satellites, WhichCoupling, isotope_labels

if TYPE_CHECKING:
    from ..spinsystem import SpinSystem


def export(
    results: Results,
    level: LevelId = None,
    g: GFactor = None,
    peak_to_peak_width_mT: Annotated[
        float | None, typer.Option("--peak-to-peak-width-mT", help="Line width to hand over, if any.")
    ] = None,
    isotope: NamedIsotopes = None,
    satellites: Satellites = None,
    coupling: WhichCoupling = "averaged",
    output: Annotated[Path | None, typer.Option(help="JSON file; default: standard output.")] = None,
    flat: Annotated[
        Path | None, typer.Option(metavar="FILE.csv", help="Also a CSV file, one row per group.")
    ] = None,
) -> None:
    """Write the spin system of one or more results as JSON that any simulator can be fed from.

    Its JSON Schema is shipped with the package (data/spin-system.schema.json).
    """
    from ..errors import InputError
    from ..files import write_atomically
    from ..result import load_result
    from ..spectrum.isotopologues import Question, spin_systems, taken_notes
    from ..spinsystem import systems_csv, systems_text

    for path, ending in ((output, ".json"), (flat, ".csv")):
        if path is not None and path.suffix.lower() != ending:
            raise InputError(
                f"{path}: this file is {ending.removeprefix('.').upper()}; let its name end in {ending}"
            )
    question = Question(
        level,
        coupling,
        isotope_labels(isotope),
        satellites,
        g,
        peak_to_peak_width_mT,
    )
    systems: list[SpinSystem] = []
    notes: list[str] = []
    for path in results:
        result = load_result(path)
        found = spin_systems(result, question)
        systems += found
        notes += taken_notes(result, found)
    text = systems_text(systems)
    if flat is not None:
        write_atomically(flat, systems_csv(systems))
        notes.append(f"groups written to {flat}")
    if output is not None:
        write_atomically(output, text)
        notes.append(f"{len(systems)} spin system{'s' if len(systems) > 1 else ''} written to {output}")
    print("\n".join(notes), file=sys.stdout if output else sys.stderr)
    if output is None:
        sys.stdout.write(text)
