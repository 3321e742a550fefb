"""Solvents: those of PySCF's SMD table, and our own spellings and additions in data/solvents.csv."""

from __future__ import annotations

import contextlib
import math
import re
from csv import DictReader
from functools import cache
from importlib import resources

from ..errors import ChoiceError, nearest
from ..point import Solvent


def _solvent_key(text: str) -> str:
    return re.sub(r"[-_,'\s]", "", text).casefold()


@cache
def _solvents() -> dict[str, Solvent]:
    """Solvents by folded spelling: PySCF's table, then our names, spellings and additions."""
    from pyscf.solvent.smd import solvent_db

    found = {
        _solvent_key(name): Solvent(name, float(values[5])) for name, values in solvent_db.items() if name
    }
    table = resources.files("unpaired").joinpath("data/solvents.csv").read_text(encoding="utf-8")
    for row in DictReader(table.splitlines()):
        in_pyscf = row["name_in_pyscf"]
        dielectric = float(solvent_db[in_pyscf][5]) if in_pyscf else float(row["dielectric"])
        solvent_found = Solvent(row["name"], dielectric)
        for spelling in filter(None, [row["name"], in_pyscf, *row["other_spellings"].split("; ")]):
            found[_solvent_key(spelling)] = solvent_found
    return found


def solvent(value: str | float) -> Solvent:
    """A continuum by name (`THF`, `dimethyl sulfoxide`) or by its dielectric constant, 1 or more."""
    if isinstance(value, bool) or not isinstance(value, (str, int, float)):
        raise ChoiceError(f"solvent {value!r} is neither a name nor a dielectric constant")
    if isinstance(value, str):
        with contextlib.suppress(ValueError):
            value = float(value)
    if isinstance(value, str):
        found = _solvents().get(_solvent_key(value))
        if found is None:
            known = [item.name for item in _solvents().values()]
            raise ChoiceError(
                f'solvent "{value}" is not known{nearest(value, known)} '
                "(a name such as water or toluene, or a dielectric constant; leave it out for the gas phase)"
            )
        return found
    if not (math.isfinite(value) and value >= 1):
        raise ChoiceError(f"solvent {value:g}: a dielectric constant is a finite number from 1 up")
    return Solvent(f"{value:g}", float(value))
