"""`unpaired nuclei`: what is known of each nucleus with a spin."""

from __future__ import annotations

from fractions import Fraction
from typing import TYPE_CHECKING, Annotated

import typer

if TYPE_CHECKING:
    from ..nuclei import Isotope

HEADINGS = (
    "isotope",
    "spin",
    "nuclear_g",
    "abundance",
    "coupling_per_density_MHz",
    "coupling_per_density_mT",
    "quadrupole_barn",
    "source",
)


def nuclei(
    isotopes: Annotated[
        list[str] | None, typer.Argument(metavar="ISOTOPE", help="Such as 13C; all if left out.")
    ] = None,
) -> None:
    """Print spin, nuclear g, abundance, coupling per unit spin density and source of isotopes.

    The coupling is that of a doublet with a spin density of 1 bohr^-3 at the nucleus, in mT for g_e.
    Abundance is the natural share of the element's nuclei (0 to 1).
    """
    from ..layout import layout
    from ..nuclei import all_isotopes, isotope

    chosen = [isotope(name) for name in isotopes] if isotopes else all_isotopes()
    print(layout(HEADINGS, [_cells(nucleus) for nucleus in chosen], left=1, left_last=True), end="")


def _cells(nucleus: Isotope) -> list[str]:
    from ..constants import contact_coupling_MHz, mT_from_MHz

    coupling_MHz = contact_coupling_MHz(1.0, nucleus.nuclear_g, multiplicity=2)
    quadrupole = nucleus.quadrupole_barn
    return [
        nucleus.name,
        str(Fraction(nucleus.spin)),
        f"{nucleus.nuclear_g:.9g}",
        f"{nucleus.abundance:.9g}",
        f"{coupling_MHz:.4f}",
        f"{mT_from_MHz(coupling_MHz):.5f}",
        "-" if quadrupole is None else f"{quadrupole:.9g}",
        nucleus.source,
    ]
