"""Isotopes with a nuclear spin: spin, magnetic moment, abundance, mass, quadrupole moment.

The numbers stand in data/nuclei.csv, which says row by row where a moment was read. It goes from hydrogen
to krypton and holds every natural isotope with a spin, and 3H.
"""

from __future__ import annotations

import re
from csv import DictReader
from dataclasses import dataclass
from fractions import Fraction
from functools import cache
from importlib import resources

from .errors import ChoiceError, nearest
from .molecule import ATOMIC_NUMBER

ISOTOPE_EDITION = (
    "magnetic moments: N. J. Stone, INDC(NDS)-0794 (2019) and CODATA 2022 for the nuclei that say so, "
    "mendeleev 1.3.0 for the others; quadrupole moments and masses: mendeleev 1.3.0, four quadrupole moments "
    "from memory; abundances: IUPAC 2013, from memory"
)
"""What the table was made from; `unpaired nuclei` prints the source of every row."""

LAST_ELEMENT = "Kr"


@dataclass(frozen=True)
class Isotope:
    """A nucleus with a spin."""

    name: str
    """Mass number and element, such as 13C."""
    element: str
    atomic_number: int
    mass_number: int
    spin: float
    """I."""
    moment_mu_N: float
    """Magnetic dipole moment in nuclear magnetons, signed."""
    abundance: float
    """Natural share of the element's nuclei, 0 to 1; 0 for 3H."""
    mass_u: float
    """Mass of the neutral atom in unified atomic mass units."""
    quadrupole_barn: float | None
    """Electric quadrupole moment; None for spin 1/2, which has none."""
    source: str
    """Where the magnetic moment was read; then, after a semicolon, the quadrupole moment."""

    @property
    def nuclear_g(self) -> float:
        """g_N = moment / (I mu_N), signed."""
        return self.moment_mu_N / self.spin


@cache
def all_isotopes() -> tuple[Isotope, ...]:
    """The table, by atomic number and mass number."""
    text = resources.files("unpaired").joinpath("data/nuclei.csv").read_text(encoding="utf-8")
    found = []
    for row in DictReader(text.splitlines()):
        mass_number, element = _split(row["isotope"])
        quadrupole, quadrupole_source = row["quadrupole_barn"], row["quadrupole_source"]
        found.append(
            Isotope(
                name=row["isotope"],
                element=element,
                atomic_number=ATOMIC_NUMBER[element],
                mass_number=mass_number,
                spin=float(Fraction(row["spin"])),
                moment_mu_N=float(row["moment_mu_N"]),
                abundance=float(row["abundance"]),
                mass_u=float(row["mass_u"]),
                quadrupole_barn=float(quadrupole) if quadrupole else None,
                source=row["moment_source"] + (f"; quadrupole: {quadrupole_source}" if quadrupole else ""),
            )
        )
    return tuple(found)


def _split(name: str) -> tuple[int, str]:
    """Mass number and element symbol of `13C`."""
    digits = re.match(r"\d+", name)
    assert digits is not None
    return int(digits.group()), name[digits.end() :]


@cache
def _by_name() -> dict[str, Isotope]:
    return {isotope.name: isotope for isotope in all_isotopes()}


def isotope(name: str) -> Isotope:
    """The isotope called `13C` (also `C13`, `C-13`, `13c`; D and T are 2H and 3H).

    Raises ChoiceError if it has no spin or is not in the table, naming those of the element that are.
    """
    known = _by_name()
    spelled = _canonical(name)
    if spelled in known:
        return known[spelled]
    match = re.fullmatch(r"(\d+)([A-Z][a-z]?)", spelled)
    if match is None or match.group(2) not in ATOMIC_NUMBER:
        raise ChoiceError(
            f'isotope "{name}" does not exist{nearest(name, known)} (mass number and element, such as 13C)'
        )
    mass_number, element = int(match.group(1)), match.group(2)
    of_element = ", ".join(item.name for item in isotopes_of(element))
    if ATOMIC_NUMBER[element] > ATOMIC_NUMBER[LAST_ELEMENT]:
        offer = f"the table goes from H to {LAST_ELEMENT}"
    elif of_element:
        offer = f"{element} in the table: {of_element}"
    else:
        offer = f"{element} has no stable isotope with a spin"
    if mass_number % 2 == 0 and ATOMIC_NUMBER[element] % 2 == 0:
        raise ChoiceError(f'isotope "{name}" has no nuclear spin ({offer})')
    raise ChoiceError(f'isotope "{name}" is not in the table ({offer})')


def _canonical(name: str) -> str:
    """`13C` from the usual spellings; anything else comes back as it is."""
    text = name.strip()
    if text.upper() in {"D", "T"}:
        return {"D": "2H", "T": "3H"}[text.upper()]
    match = re.fullmatch(r"(\d+)[-\s]?([A-Za-z]{1,2})", text)
    if match is not None:
        return f"{int(match.group(1))}{match.group(2).capitalize()}"
    match = re.fullmatch(r"([A-Za-z]{1,2})[-\s]?(\d+)", text)
    if match is not None:
        return f"{int(match.group(2))}{match.group(1).capitalize()}"
    return text


@cache
def isotopes_of(element: str) -> tuple[Isotope, ...]:
    """Isotopes of an element with a spin, by mass number; empty if there are none or no data."""
    return tuple(item for item in all_isotopes() if item.element == element)


@cache
def table_isotope(element: str) -> Isotope | None:
    """The most abundant isotope of an element that has a spin; None if there is none."""
    return max(isotopes_of(element), key=lambda item: item.abundance, default=None)


@cache
def natural_composition(element: str) -> tuple[tuple[Isotope | None, float], ...]:
    """Natural isotopes and their shares, largest first; None stands for all spinless isotopes together.

    The shares sum to 1. Raises ChoiceError for an element beyond the table.
    """
    if ATOMIC_NUMBER.get(element, 999) > ATOMIC_NUMBER[LAST_ELEMENT]:
        raise ChoiceError(f"no isotope data for {element} (the table goes from H to {LAST_ELEMENT})")
    shares: list[tuple[Isotope | None, float]] = [
        (item, item.abundance) for item in isotopes_of(element) if item.abundance > 0
    ]
    spinless = round(1.0 - sum(share for _, share in shares), 12)
    if spinless > 0:
        shares.append((None, spinless))
    return tuple(sorted(shares, key=lambda pair: -pair[1]))
