"""unpaired structure: settle structures without computing couplings, and write them as XYZ."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Annotated

import typer


def structure(
    recipes: Annotated[list[Path], typer.Argument(metavar="RECIPE...", help="Recipe files.")],
    output: Annotated[
        Path | None,
        typer.Option(help="XYZ file for one recipe; a folder for several (it gets <radical>.xyz)."),
    ] = None,
    out: Annotated[
        Path, typer.Option(help="Folder whose store keeps finished steps; they are not computed again.")
    ] = Path("results"),
    prove: Annotated[
        bool, typer.Option("--prove", help="Check the curvature of structure files without relaxing them.")
    ] = False,
) -> None:
    """Build, relax and prove the structure of every recipe; print its story and write XYZ."""
    from ..errors import InputError
    from ..files import require_writable, write_atomically
    from ..recipe.load import load_recipes
    from ..settle import prove as proven
    from ..settle import settle
    from ..store import STORE_FOLDER
    from ..structures.xyz import xyz_text
    from .progress import Progress

    loaded = load_recipes(recipes)
    into_folder = output is not None and (len(loaded) > 1 or output.is_dir())
    if output is not None and not into_folder and output.suffix.lower() != ".xyz":
        raise InputError(f"{output}: a structure is written as .xyz; give a name that ends so, or a folder")
    if output is not None:
        require_writable(output if into_folder else output.parent)
    require_writable(out)
    with Progress() as progress:
        for recipe in loaded:

            def report(
                stage: str, step: int, energy: float, gradient: float, name: str = recipe.radical
            ) -> None:
                progress.show(f"{name}  {stage}  step {step}  {energy:.6f} Eh  gradient {gradient:.1e}")

            check = prove and recipe.molecule is not None and not recipe.relax
            settled = (proven if check else settle)(recipe, report, out / STORE_FOLDER)
            text = xyz_text(settled.molecule, settled.note)
            lines = [*settled.story, *(f"{flag.code}: {flag.advice}" for flag in settled.flags)]
            if settled.seconds:
                lines.append("wall time: " + ", ".join(f"{stage} {s:.1f} s" for stage, s in settled.seconds))
            progress.say("\n".join(f"{recipe.radical}: {line}" for line in lines))
            if output is None:
                progress.print(text)
            else:
                path = output / f"{recipe.radical}.xyz" if into_folder else output
                write_atomically(path, text)
                progress.say(f"{recipe.radical}: written to {path}")
    sys.stdout.flush()
