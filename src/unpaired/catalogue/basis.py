"""Basis sets: any of basis-set-exchange, and those that PySCF alone has."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from functools import cache
from typing import Any

from ..errors import ChoiceError, nearest
from ..molecule import ATOMIC_NUMBER

FOR_HYPERFINE = ("pcH-1", "pcH-2", "aug-cc-pVTZ-J", "IGLO-III", "pcJ-1", "pcJ-2", "acv3z-J", "UGBS")
"""Basis sets that describe the density at a nucleus, offered where a basis set lacks an element."""

Shell = list[Any]
"""PySCF's list of one shell: angular momentum, then [exponent, coefficient, ...] per primitive."""


def fold(name: str) -> str:
    """Letters and signs that tell two names apart; hyphens, underscores, blanks and case do not."""
    return re.sub(r"[-_\s]", "", name).casefold()


@cache
def _exchange() -> dict[str, dict[str, Any]]:
    """Metadata of basis-set-exchange by folded name; a real name is never hidden by another's alias."""
    import basis_set_exchange

    sets = basis_set_exchange.get_metadata().values()
    found = {fold(other): entry for entry in sets for other in entry["other_names"]}
    return found | {fold(entry["display_name"]): entry for entry in sets}


@cache
def _own_names() -> dict[str, str]:
    """Basis sets that PySCF alone has, by folded name."""
    from pyscf.gto.basis import ALIAS

    return {fold(name): name for name in ALIAS if fold(name) not in _exchange()}


def _is_fitting_set(folded: str) -> bool:
    entry = _exchange().get(folded)
    if entry is not None:
        return bool(entry["role"] != "orbital")
    return folded.endswith(("fit", "ri", "+etb"))


@cache
def basis_name(text: str) -> str:
    """Canonical spelling: that of basis-set-exchange (`pcH-1`), or PySCF's for sets that PySCF alone has."""
    folded = fold(text)
    if folded in _exchange():
        name = str(_exchange()[folded]["display_name"])
    elif folded in _own_names():
        name = _own_names()[folded]
    elif (pople := _pople_name(folded)) is not None:
        name = pople
    elif folded.startswith("gth"):
        raise ChoiceError(
            f'basis set "{text}" is made for pseudopotentials, which leave no density at a nucleus'
        )
    else:
        known = [entry["display_name"] for entry in _exchange().values()] + list(_own_names().values())
        raise ChoiceError(
            f'basis set "{text}" does not exist{nearest(text, known)} '
            f"(any of basis-set-exchange or PySCF; for hyperfine couplings: {', '.join(FOR_HYPERFINE[:4])})"
        )
    if _is_fitting_set(folded):
        raise ChoiceError(f'"{name}" is an auxiliary set for fitting, not a basis set for orbitals')
    return name


def _pople_name(folded: str) -> str | None:
    """`6-31G(2df,p)` and the like, whose polarisation functions PySCF adds by name; None if it cannot."""
    match = re.fullmatch(r"(321|431|631|6311)(\+{0,2}g)\((\d?[a-z]+)(,\d?[a-z]+)?\)", folded)
    if match is None or not _pyscf_shells(folded, "C"):
        return None
    digits, letters, heavy, light = match.groups()
    return f"{digits[0]}-{digits[1:]}{letters.upper()}({heavy}{light or ''})"


@cache
def _pyscf_shells(name: str, element: str) -> tuple[Shell, ...]:
    """PySCF's own data; empty if it has none."""
    from pyscf.gto import basis
    from pyscf.lib.exceptions import BasisNotFoundError

    # The blank keeps PySCF from taking a file of that name in the working directory for the basis set.
    try:
        return tuple(basis.load(f" {name}", element))
    except (BasisNotFoundError, OSError, KeyError):
        return ()


@cache
def _exchange_data(name: str, element: str) -> dict[str, Any]:
    import basis_set_exchange

    number = ATOMIC_NUMBER[element]
    data = basis_set_exchange.get_basis(name, elements=[number])
    return dict(data["elements"][str(number)])


def _has_element(name: str, element: str) -> bool:
    entry = _exchange().get(fold(name))
    if entry is None:
        return bool(_pyscf_shells(name, element))
    listed = entry["versions"][entry["latest_version"]]["elements"]
    if str(ATOMIC_NUMBER[element]) not in listed:
        return False
    # Only where there are potentials can an entry be without functions, and reading the data takes its time.
    return "scalar_ecp" not in entry["function_types"] or "electron_shells" in _exchange_data(name, element)


def check_basis(name: str, elements: Iterable[str]) -> None:
    """Make sure that the basis set has functions for every element, core included.

    Raises ChoiceError that names the elements it lacks, or whose core it replaces by a potential, and basis
    sets that have them all.
    """
    name = basis_name(name)
    wanted = sorted(set(elements), key=ATOMIC_NUMBER.__getitem__)
    lacking = [element for element in wanted if not _has_element(name, element)]
    if lacking:
        raise ChoiceError(f'basis set "{name}" has no {_listed(lacking)}{_alternatives(wanted)}')
    replaced = [element for element in wanted if has_core_potential(name, element)]
    if replaced:
        raise ChoiceError(
            f'basis set "{name}" replaces the core of {_listed(replaced)} by a potential, so there is no '
            f"spin density at that nucleus{_alternatives(wanted)}"
        )


def _listed(elements: Sequence[str]) -> str:
    return " and ".join(filter(None, [", ".join(elements[:-1]), elements[-1]]))


def _alternatives(elements: Sequence[str]) -> str:
    fitting = [name for name in FOR_HYPERFINE if all(_has_element(name, element) for element in elements)]
    return f"; these have all elements of the molecule: {', '.join(fitting)}" if fitting else ""


def basis_for(name: str, element: str) -> list[Shell]:
    """Basis functions of one element in PySCF's list form: [l, [exponent, coefficient, ...], ...] per shell.

    The functions are those of basis-set-exchange, or PySCF's where only PySCF has the set; they are meant as
    spherical harmonics. Raises ChoiceError if the set lacks the element.
    """
    name = basis_name(name)
    if not _has_element(name, element):
        raise ChoiceError(f'basis set "{name}" has no {element}{_alternatives([element])}')
    if fold(name) not in _exchange():
        # A number after the angular momentum is for relativistic spinors only.
        return [
            [row for place, row in enumerate(shell) if place == 0 or not isinstance(row, int)]
            for shell in _pyscf_shells(name, element)
        ]
    return _shells(_exchange_data(name, element)["electron_shells"])


def _shells(shells: Sequence[dict[str, Any]]) -> list[Shell]:
    """Shells of basis-set-exchange as PySCF's lists, lowest angular momentum first.

    A combined shell (sp) has one column of coefficients per angular momentum; otherwise every column is a
    contraction of one angular momentum.
    """
    converted: list[Shell] = []
    for shell in shells:
        exponents = [float(value) for value in shell["exponents"]]
        columns = [[float(value) for value in column] for column in shell["coefficients"]]
        momenta = shell["angular_momentum"]
        parts = (
            [(momenta[0], columns)]
            if len(momenta) == 1
            else [(momentum, [column]) for momentum, column in zip(momenta, columns, strict=True)]
        )
        for momentum, own in parts:
            rows = [list(row) for row in zip(exponents, *own, strict=True)]
            converted.append([momentum, *(row for row in rows if any(row[1:]))])
    return sorted(converted, key=lambda shell: int(shell[0]))


_VALENCE_ONLY = re.compile(r"bfd|ccecp|ecp|qavgvszp|stuttgart|sbkjc|pawl|.*ppnr$")
"""Sets without core functions whose data name no potential: they are made for one, or for projectors."""


@cache
def has_core_potential(name: str, element: str) -> bool:
    """Whether the set replaces the core of this element by a potential: no density at the nucleus then."""
    name = basis_name(name)
    if _VALENCE_ONLY.match(fold(name)):
        return True
    if fold(name) in _exchange():
        return _has_element(name, element) and "ecp_potentials" in _exchange_data(name, element)
    from pyscf.gto import basis
    from pyscf.lib.exceptions import BasisNotFoundError

    try:
        return bool(basis.load_ecp(f" {name}", element))
    except (BasisNotFoundError, OSError, KeyError):
        return False
