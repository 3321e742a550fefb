"""Findings about a state and its couplings: each a Flag with value, limit and advice."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from . import catalogue
from .constants import mT_from_MHz
from .flag import Flag, Severity
from .point import Point
from .state import State
from .structures.groups import Group
from .tight import tightness

# Limits of D = <S^2> - S(S+1) for a doublet: UHF ok < 0.02, caution < 0.10; Kohn-Sham ok < 0.02, caution < 0.05.
CONTAMINATION_CAUTION = 0.02
CONTAMINATION_BAD = {"UHF": 0.10, "UKS": 0.05}
SYMMETRY_TOLERANCE_MT = 0.02
SYMMETRY_TOLERANCE_SHARE = 0.02
HEAVY_CAUTION = 18
HEAVY_BAD = 36
WEAK_PAIR = 0.1


def contamination(state: State, point: Point) -> float:
    """<S^2> - S(S+1)."""
    spin = point.molecule.spin
    return state.s_squared - spin * (spin + 1)


def contamination_flags(state: State, point: Point) -> list[Flag]:
    """Spin contamination of an unrestricted state against the band of its method."""
    level = point.level
    if not level.is_unrestricted:
        return []
    value = contamination(state, point)
    # The weight of the first contaminant is about D/(2S+2): the same weight as for a doublet is the limit.
    scale = (2 * point.molecule.spin + 2) / 3
    bad, caution = CONTAMINATION_BAD[level.scf] * scale, CONTAMINATION_CAUTION * scale
    if value < caution:
        return []
    severity: Severity = "bad" if value >= bad else "caution"
    limit = bad if severity == "bad" else caution
    if level.scf == "UHF":
        advice = (
            "the wavefunction mixes in higher spin states and exaggerates spin polarisation: do not judge a "
            "candidate by these couplings, use the density-functional level"
            if severity == "bad"
            else "the wavefunction mixes in higher spin states, spin polarisation is exaggerated: lean on the "
            "density-functional level"
        )
    else:
        advice = (
            "unusually large for a density functional: suspect a wrong state, compare with another functional"
            if severity == "bad"
            else "somewhat large for a density functional: compare with another functional"
        )
    return [Flag("contaminated", severity, advice, value, limit, level.id)]


def exaggeration_flags(point: Point) -> list[Flag]:
    """UHF overshoots spin polarisation also where its contamination is small (CH3: D = 0.011, 1H twofold)."""
    electrons, unpaired = point.molecule.electrons, point.molecule.multiplicity - 1
    if point.level.scf != "UHF" or electrons == unpaired:
        return []
    return [
        Flag(
            "exaggerated-polarisation",
            "note",
            "UHF exaggerates spin polarisation even where its contamination is small: experiment usually lies "
            "between its projected and its plain coupling",
            level=point.level.id,
        )
    ]


def no_isotope_flags(point: Point, isotopes: Sequence[str | None]) -> list[Flag]:
    """Nuclei that have no coupling because the table of isotopes ends before them."""
    return [
        Flag(
            "no-isotope-data",
            "caution",
            f"the table of isotopes has none of {element}: if it has a spin, its splitting is missing from "
            "couplings and spectra",
            level=point.level.id,
            atom=label,
        )
        for label, element, number, isotope in zip(
            point.molecule.labels,
            point.molecule.elements,
            point.molecule.atomic_numbers,
            isotopes,
            strict=True,
        )
        if isotope is None and number > HEAVY_BAD
    ]


def heavy_atom_flags(point: Point) -> list[Flag]:
    """Elements for which a non-relativistic first-order coupling is doubtful."""
    flags = []
    for label, number in zip(point.molecule.labels, point.molecule.atomic_numbers, strict=True):
        if number <= HEAVY_CAUTION:
            continue
        severity: Severity = "bad" if number > HEAVY_BAD else "caution"
        flags.append(
            Flag(
                "heavy-atom",
                severity,
                "no relativity and no spin-orbit coupling here: couplings of heavy nuclei can be off by tens of "
                "per cent, and g shifts are large",
                float(number),
                float(HEAVY_BAD if severity == "bad" else HEAVY_CAUTION),
                point.level.id,
                label,
            )
        )
    return flags


def contracted_basis_flags(point: Point, isotopes: Sequence[str | None]) -> list[Flag]:
    """Basis sets that are too rigid at a coupled nucleus: made for energies, not for couplings."""
    flags = []
    for label, element, number, isotope in zip(
        point.molecule.labels, point.molecule.elements, point.molecule.atomic_numbers, isotopes, strict=True
    ):
        if isotope is None:
            continue
        value, limit = tightness(catalogue.basis_for(point.level.basis, element), number)
        if value < limit:
            flags.append(
                Flag(
                    "contracted-basis",
                    "caution" if element in ("H", "He") else "bad",
                    "too few free, tight s functions at the nucleus (value against limit): couplings can be off by "
                    "half or have the wrong sign; take pcH-1, pcH-2 or another set made for couplings",
                    value,
                    limit,
                    point.level.id,
                    label,
                )
            )
    return flags


def restricted_flags(point: Point) -> list[Flag]:
    """Restricted-open levels lack spin polarisation by construction."""
    if point.level.is_unrestricted:
        return []
    return [
        Flag(
            "no-polarisation",
            "note",
            "a restricted-open level shows the direct part alone, zero in a nodal plane: that is its answer and "
            "not an error, but do not compare it with measured couplings",
            level=point.level.id,
        )
    ]


def parts_flags(point: Point, weakest_pair: float | None) -> list[Flag]:
    """An alpha orbital that hardly overlaps with its partner could as well be the unpaired one."""
    if weakest_pair is None or weakest_pair >= WEAK_PAIR:
        return []
    return [
        Flag(
            "parts-arbitrary",
            "caution",
            "a pair of electrons is nearly broken (a stretched bond, or two radicals in one): which of its orbitals "
            "counts as the unpaired one is arbitrary, so use the coupling, not its direct and polarisation parts",
            value=weakest_pair,
            limit=WEAK_PAIR,
            level=point.level.id,
        )
    ]


def high_spin_flags(point: Point) -> list[Flag]:
    """More than one unpaired electron: the spectrum needs terms that are not computed."""
    if point.molecule.multiplicity <= 2:
        return []
    return [
        Flag(
            "zero-field-splitting",
            "caution",
            "more than one unpaired electron (an even number of electrons gives a triplet unless the recipe says "
            "otherwise): couplings are per 2S, and zero-field splitting, which shapes the spectrum, is not computed",
            float(point.molecule.multiplicity),
            2.0,
            point.level.id,
        )
    ]


BROKEN = (
    "nuclei that the geometry makes equivalent differ (value and limit in mT): the wavefunction broke the "
    "symmetry, its couplings are not those of the molecule"
)
ONE_COMPONENT = (
    "one component of a degenerate state: single nuclei differ (value and limit in mT) and belong to this "
    "component, the mean of the group is what a spectrum shows if the components interconvert"
)


def broken_symmetry_flags(
    point: Point, state: State, groups: Sequence[Group], couplings_MHz: Sequence[float | None]
) -> list[Flag]:
    """Nuclei that symmetry makes equivalent, but whose couplings differ: bad, unless the state is degenerate.

    One component of a Jahn-Teller state must look like this; the mean over the symmetric set is the same for every
    component. A component of a degenerate state of a linear molecule has equal couplings at equal nuclei.
    """
    degenerate = state.engine.get("degenerate") == "Jahn-Teller"
    flags = []
    for group in groups:
        values = [couplings_MHz[member] for member in group.members]
        if group.origin != "symmetry" or any(value is None for value in values):
            continue
        field = np.array([mT_from_MHz(value) for value in values if value is not None])
        spread = float(np.ptp(field))
        limit = max(SYMMETRY_TOLERANCE_MT, SYMMETRY_TOLERANCE_SHARE * abs(float(field.mean())))
        if spread > limit:
            flags += [
                Flag(
                    "one-component" if degenerate else "symmetry-broken",
                    "caution" if degenerate else "bad",
                    ONE_COMPONENT if degenerate else BROKEN,
                    spread,
                    limit,
                    point.level.id,
                    point.molecule.labels[member],
                )
                for member in group.members
            ]
    return flags
