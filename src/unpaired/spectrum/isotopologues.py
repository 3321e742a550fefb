"""Which isotopes the molecules hold: from a result to spin systems with shares, without another calculation.

Spin densities do not depend on the isotope; only moments and spins change, so a coupling is carried over with
the ratio of the nuclear g values. (Motion does depend on masses: an average made for one isotope is carried
over without the mass effect, and the caller is told.)
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from ..constants import CODATA_EDITION, ELECTRON_G, MHZ_PER_MT
from ..errors import ChoiceError, InputError, require_choice
from ..flag import SEVERITIES
from ..nuclei import Isotope, isotope
from ..result import Result, Row
from ..spinsystem import SpinGroup, SpinNucleus, SpinSystem, Tensor
from .natural import Filling, combinations, fillings, is_usual

COUPLING_KINDS = ("averaged", "equilibrium")

MOST_NAMED = 6
AVERAGED_COLUMN = "a_averaged_mT"
TENSOR_COLUMNS = tuple(tuple(f"t_{min(a, b)}{max(a, b)}_MHz" for b in "xyz") for a in "xyz")


@dataclass(frozen=True)
class Site:
    """A group of the result: atoms that share one coupling."""

    atoms: tuple[str, ...]
    element: str
    table_isotope: Isotope | None
    """The isotope that the numbers of the result are for."""
    coupling_mT: float | None
    averaged: bool
    tensors: Mapping[str, Tensor | None]


@dataclass(frozen=True)
class Question:
    """Which spin systems are wanted of a result."""

    level: str | None = None
    """Level id; None is the last of the recipe."""
    coupling: str = "averaged"
    """Averaged couplings where the result has them, or equilibrium ones throughout."""
    labels: Mapping[str, str] | None = None
    """Atom label or element to isotope, beyond what the recipe names."""
    least_share: float | None = None
    """Keep every isotopologue down to this share; None for main isotopes, with the default mixtures."""
    g_iso: float | None = None
    """None for the measured value of the recipe, else g_e."""
    width_mT: float | None = None


def spin_systems(result: Result, question: Question) -> tuple[SpinSystem, ...]:
    """The isotopologues of a result, most abundant first.

    Raises ChoiceError for a level or label that is not there, InputError for a level without numbers, for a
    share outside 0..1 and for a g that is not positive.
    """
    level = result.level_id(question.level)
    require_choice("coupling", question.coupling, COUPLING_KINDS)
    if question.least_share is not None and not 0 < question.least_share < 1:
        raise InputError(
            f"the least share of an isotopologue lies between 0 and 1, found {question.least_share}"
        )
    if question.width_mT is not None and not (math.isfinite(question.width_mT) and question.width_mT > 0):
        raise InputError(f"the peak-to-peak width must be positive, found {question.width_mT} mT")
    g_iso, g_source = g_of(result, question.g_iso)
    sites = sites_of(result, level, question.coupling)
    fixed = _fixed_isotopes(result, question.labels or {})
    free = [sum(atom not in fixed for atom in site.atoms) if site.table_isotope else 0 for site in sites]
    choices = [
        fillings(site.element, count, question.least_share) for site, count in zip(sites, free, strict=True)
    ]
    kind = "averaged" if any(site.averaged for site in sites) else "equilibrium"
    return tuple(
        SpinSystem(
            radical=result.radical,
            level=level,
            electron_spin=result.molecule.spin,
            g_iso=g_iso,
            g_source=g_source,
            coupling_kind=kind,
            groups=tuple(
                group
                for site, filling in zip(sites, filled, strict=True)
                for group in _groups(result, level, site, filling, fixed)
            ),
            isotopologue=_name(sites, filled, fixed),
            share=share,
            peak_to_peak_width_mT=question.width_mT,
            provenance=_provenance(result, level, sites, kind),
        )
        for share, filled in combinations(choices, question.least_share)
    )


def g_of(result: Result, given: float | None) -> tuple[float, str]:
    """g and where it comes from: given, measured (recipe), or the free electron's."""
    if given is not None:
        if not (math.isfinite(given) and given > 0):
            raise InputError(f"g must be positive, found {given}")
        return given, "given with the command"
    measured = result.recipe.get("g")
    if measured:
        source = measured.get("source") or "source not given"
        return float(measured["value"]), f"measured, from the recipe: {source}"
    return ELECTRON_G, f"free electron, {CODATA_EDITION}; not measured and not predicted"


def sites_of(result: Result, level: str, coupling: str) -> list[Site]:
    """The groups of a level with their couplings."""
    members: dict[str, list[Row]] = {}
    for row in result.rows("couplings", level):
        members.setdefault(row["group"] or row["atom"], []).append(row)
    sites = []
    for rows in members.values():
        first = rows[0]
        averages = [row.get(AVERAGED_COLUMN) for row in rows] if coupling == "averaged" else []
        known = [value for value in averages if value is not None]
        value = sum(known) / len(known) if known else first["a_group_mT"]
        sites.append(
            Site(
                atoms=tuple(row["atom"] for row in rows),
                element=first["atom"].rstrip("0123456789"),
                table_isotope=isotope(first["isotope"]) if first["isotope"] else None,
                coupling_mT=value,
                averaged=bool(known),
                tensors={row["atom"]: _tensor(row) for row in rows},
            )
        )
    return sites


def _tensor(row: Row) -> Tensor | None:
    values: Any = tuple(tuple(row.get(name) for name in names) for names in TENSOR_COLUMNS)
    return None if any(value is None for line in values for value in line) else values


def _fixed_isotopes(result: Result, labels: Mapping[str, str]) -> dict[str, Isotope]:
    """Isotope per atom label, from the recipe and then from `labels`, which may name elements."""
    known = result.molecule.labels
    elements = set(result.molecule.elements)
    fixed = {atom: isotope(name) for atom, name in (result.recipe.get("isotopes") or {}).items()}
    for label, name in sorted(labels.items(), key=lambda item: item[0] in known):  # atoms outrank elements
        chosen = isotope(name)
        atoms = [label] if label in known else [atom for atom in known if atom.rstrip("0123456789") == label]
        if not atoms:
            raise ChoiceError(
                f'"{label}" is neither an atom nor an element of {result.radical} '
                f"(there are {', '.join([*known, *sorted(elements)])})"
            )
        for atom in atoms:
            if chosen.element != atom.rstrip("0123456789"):
                raise ChoiceError(f"{atom} cannot be {chosen.name}: that is an isotope of {chosen.element}")
            fixed[atom] = chosen
    return fixed


def _isotope_atoms(
    site: Site, filling: Filling, fixed: Mapping[str, Isotope]
) -> list[tuple[Isotope | None, list[str]]]:
    """The atoms of a site by isotope, by first atom; nuclei with a spin go first where nothing fixes a place."""
    free = [atom for atom in site.atoms if atom not in fixed]
    kinds: dict[str, Isotope | None] = dict(fixed)
    for kind, number in sorted(filling, key=lambda pair: pair[0] is None):
        here, free = free[:number], free[number:]
        kinds |= dict.fromkeys(here, kind)
    found: dict[Isotope | None, list[str]] = {}
    for atom in site.atoms:
        found.setdefault(kinds.get(atom), []).append(atom)
    return list(found.items())


def _groups(
    result: Result, level: str, site: Site, filling: Filling, fixed: Mapping[str, Isotope]
) -> Iterator[SpinGroup]:
    for kind, atoms in _isotope_atoms(site, filling, fixed):
        if kind is None:
            continue
        if site.coupling_mT is None or site.table_isotope is None:
            raise InputError(_no_numbers(result, level))
        ratio = kind.nuclear_g / site.table_isotope.nuclear_g
        coupling_mT = site.coupling_mT * ratio
        yield SpinGroup(
            group=atoms[0],
            isotope=kind.name,
            nuclear_spin=kind.spin,
            count=len(atoms),
            a_iso_MHz=coupling_mT * MHZ_PER_MT,
            a_iso_mT=coupling_mT,
            nuclei=tuple(SpinNucleus(atom, _scaled(site.tensors[atom], ratio)) for atom in atoms),
        )


def _scaled(tensor: Tensor | None, ratio: float) -> Tensor | None:
    if tensor is None:
        return None
    scaled: Any = tuple(tuple(value * ratio for value in row) for row in tensor)
    return scaled  # type: ignore[no-any-return]


def _no_numbers(result: Result, level: str) -> str:
    reasons = [
        f"{row['code']}: {row['advice']}"
        for row in result.rows("flags")
        if row["level"] == level and row["severity"] == "bad"
    ]
    because = f" ({reasons[0]})" if reasons else ""
    others = [
        name
        for name in result.level_ids
        if any(row["a_iso_mT"] is not None for row in result.rows("couplings", name))
    ]
    instead = f"; levels with couplings: {', '.join(others)}" if others else ""
    return f"level {level} of {result.radical} has no couplings{because}{instead}"


def _name(sites: Sequence[Site], filled: Sequence[Filling], fixed: Mapping[str, Isotope]) -> str:
    """Isotopes that are fixed, rare, or part of a mixture, each with its atoms; `main` if there are none."""
    parts = []
    for site, filling in zip(sites, filled, strict=True):
        for kind, atoms in _isotope_atoms(site, filling, fixed):
            if kind is not None and not is_usual(kind, site.element):
                parts.append(f"{kind.name}({'+'.join(atoms)})")
    return " ".join(parts) or "main"


def _provenance(result: Result, level: str, sites: Sequence[Site], kind: str) -> dict[str, Any]:
    """Versions and editions, what was found about the level (code and severity), and what was not averaged."""
    findings = {
        row["code"]: f"{row['code']} ({row['severity']})"
        for row in sorted(result.rows("flags"), key=lambda row: SEVERITIES.index(row["severity"]))
        if row["level"] in (None, level)
    }  # of several severities of one code the worst stays
    entries: dict[str, Any] = {**result.provenance, "findings": list(findings.values())}
    if kind == "averaged":
        entries["not_averaged"] = [site.atoms[0] for site in sites if not site.averaged]
    return entries


def taken_notes(result: Result, systems: Sequence[SpinSystem]) -> list[str]:
    """What was taken from a result, in sentences: level, couplings, g, isotopologues."""
    first = systems[0]
    couplings = f"{first.coupling_kind} couplings"
    missing = first.provenance.get("not_averaged", ())
    if missing:
        couplings += f" (equilibrium ones, for want of an average, for {', '.join(missing)})"
    notes = [
        f"{result.radical}: level {first.level}, {couplings}",
        f"{result.radical}: g = {first.g_iso:.6f} ({first.g_source})",
    ]
    if len(systems) == 1 and first.isotopologue != "main":
        notes.append(f"{result.radical}: isotopologue {first.isotopologue}")
    elif len(systems) > 1:
        kept = sum(system.share for system in systems)
        named = [f"{system.isotopologue} {100 * system.share:.2f} %" for system in systems[:MOST_NAMED]]
        more = f", and {len(systems) - MOST_NAMED} more" if len(systems) > MOST_NAMED else ""
        notes.append(
            f"{result.radical}: {len(systems)} isotopologues with {100 * kept:.2f} % of the molecules: "
            f"{'; '.join(named)}{more}"
        )
    doubts = first.provenance["findings"]
    if doubts:
        notes.append(f"{result.radical}: findings at this level: {', '.join(doubts)} (see the flags table)")
    masses = mass_effect_missing(result, systems)
    if masses:
        notes.append(
            f"{result.radical}: the average over the motion was made for another isotope of {', '.join(masses)}; "
            "the effect of the mass on it is not included"
        )
    return notes


def mass_effect_missing(result: Result, systems: Sequence[SpinSystem]) -> list[str]:
    """Groups whose averaged coupling is carried over to an isotope other than the one averaged for."""
    isotope_of = {row["atom"]: row["isotope"] for row in result.rows("couplings", systems[0].level)}
    found = [
        f"{group.group} ({group.isotope})"
        for system in systems
        if system.coupling_kind == "averaged"
        for group in system.groups
        if isotope_of[group.group] != group.isotope
        and group.group not in system.provenance.get("not_averaged", ())
    ]
    return list(dict.fromkeys(found))
