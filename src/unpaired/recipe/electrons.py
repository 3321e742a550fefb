"""Charge and multiplicity, which have to fit the number of electrons."""

from __future__ import annotations

from collections.abc import Sequence

from ..molecule import ATOMIC_NUMBER
from ..structures.geometry import Geometry
from ..structures.smiles import Drawing
from .section import Section


def read_charge(recipe: Section, source: Geometry | Drawing | None) -> int | None:
    """The charge: that of the recipe, else that of the structure, else 0; a disagreement is refused.

    Files of other programs often leave charges out, so that a file without any states nothing; a SMILES always does.
    """
    stated = source.charge if source else None
    if isinstance(source, Geometry) and stated == 0:
        stated = None
    if "charge" not in recipe:
        return stated or 0
    charge = recipe.integer("charge", "a whole number such as -1, 0 or 1")
    if charge is not None and stated is not None and stated != charge:
        recipe.refuse(
            "charge",
            f"the structure has the formal charge {stated:+d}; correct one of the two; found: {charge:+d}",
        )
        return None
    return charge


def read_multiplicity(recipe: Section, elements: Sequence[str] | None, charge: int | None) -> int | None:
    """2S+1, by default the lowest above 1, checked against the number of electrons where the atoms are known."""
    rule = "2S+1, one more than the number of unpaired electrons"
    asked = recipe.integer("multiplicity", f"a whole number from 2 upwards ({rule})")
    if asked is not None and asked < 2:
        what = "means no unpaired electron" if asked == 1 else "is not a multiplicity"
        recipe.refuse(
            "multiplicity", f"{what}; allowed: a whole number from 2 upwards ({rule}); found: {asked}"
        )
        return None
    if "multiplicity" in recipe.refused or charge is None or elements is None:
        return asked
    electrons = sum(ATOMIC_NUMBER[element] for element in elements) - charge
    if electrons < 1:
        recipe.refuse(
            "charge", f"leaves no electron; allowed: less than {electrons + charge:+d}; found: {charge:+d}"
        )
        return None
    lowest = 2 if electrons % 2 else 3
    if asked is None:
        asked = lowest
    fitting = [str(value) for value in range(lowest, electrons + 2, 2)]
    if str(asked) not in fitting:
        parity = "odd" if electrons % 2 else "even"
        options = ", ".join([*fitting[:3], "..."] if len(fitting) > 3 else fitting) or "none"
        recipe.refuse(
            "multiplicity",
            f"does not fit {electrons} electrons at charge {charge:+d} (an {parity} number); "
            f"allowed: {options} ({rule}); found: {asked}",
        )
        return None
    return asked
