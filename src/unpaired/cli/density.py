"""unpaired density: a picture of the spin density, or its values in a box."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer


def density(
    result: Annotated[Path, typer.Argument(metavar="RESULT", help="Folder that a run left.")],
    output: Annotated[
        Path, typer.Option(help="File: .svg or .png (picture of a plane), .vti (box, VTK XML ImageData).")
    ],
    level: Annotated[str | None, typer.Option(help="Level id; default: the last of the recipe.")] = None,
    plane: Annotated[
        str | None, typer.Option(help="Three atoms, such as C1,C2,H4; default: the plane of the molecule.")
    ] = None,
    spacing_bohr: Annotated[float, typer.Option(help="Distance of points in a box.")] = 0.2,
) -> None:
    """Show the spin density of a finished level in a plane, or write it on a box."""
    from .. import density as spin
    from ..errors import InputError
    from ..files import write_atomically
    from ..properties.grids import vtk_image
    from ..result import load_result

    ending = output.suffix.lower()
    if ending not in (".svg", ".png", ".vti"):
        raise InputError(f"{output}: the ending tells no form; use .svg or .png for a plane, .vti for a box")
    if ending == ".vti" and plane is not None:
        raise InputError("--plane: a box has no plane; leave it out, or give a picture (.svg, .png)")
    record = load_result(result)
    name = record.level_id(level)
    title = f"{record.radical}, {name}"
    if ending == ".vti":
        box = spin.choose_box(record.molecule, spacing_bohr)
        values = spin.density_in_box(*spin.stored_state(record, result, name), box)
        total = float(values.sum()) * box.spacing_bohr**3
        comment = (
            f"spin density of {title} in bohr^-3, lengths in bohr; sum times volume per point: {total:.4f}"
        )
        text = vtk_image(box, values, "spin_density", comment)
        write_atomically(output, text)
        count = " x ".join(str(count) for count in box.counts)
        typer.echo(
            f"{title}: {count} points, integral {total:.4f} (2S = {record.molecule.multiplicity - 1}), "
            f"written to {output}"
        )
        return
    from ..figures.density import density_figure

    chosen = spin.choose_plane(
        record.molecule, plane.replace(" ", "").split(",") if plane is not None else None
    )
    found = spin.density_in_plane(*spin.stored_state(record, result, name), chosen)
    bad = dict.fromkeys(
        row["code"]
        for row in record.rows("flags")
        if row["severity"] == "bad" and row["level"] in (None, name)
    )
    heading = f"{title}\nnot to be relied on: {', '.join(bad)}" if bad else title
    write_atomically(output, density_figure(found, record.molecule, heading, ending[1:]))
    typer.echo(
        f"{title}: spin density from {found.values_au.min():+.3g} to {found.values_au.max():+.3g} bohr^-3, "
        f"written to {output}"
    )
