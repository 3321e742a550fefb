"""The line list of one or more spin systems: positions, intensities, and the m_I that make each line."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError, require_choice
from ..nuclei import isotope
from ..spinsystem import SpinSystem
from .exact import exact_lines
from .orders import close_pairs, first_order, second_order, second_order_size_mT, third_order_size_mT
from .splitting import Splitting, Sweep

ORDERS = ("auto", "exact", "second", "first")

EXACT_STATES = 1024
"""Largest product space of the nuclei that is diagonalised."""
NEGLIGIBLE_SHARE_OF_WIDTH = 0.01
"""a*a/(2 B0) below this share of the width: second order cannot be told from the exact line."""
NO_SPLITTING_MHz = 1e-6
"""A weaker coupling moves no line by 1e-7 mT: its group does not multiply the lines."""
EQUAL_MHz = 1e-6
MOST_LABELLED = 300_000
"""Beyond this number of lines, those closer than a small share of the width are joined and lose their m_I."""
JOIN_SHARE_OF_WIDTH = 0.002
ABSENT = np.int16(-32768)
"""2m of a group that the line's isotopologue does not have, that splits nothing, or that was joined with
an equal one."""


@dataclass(frozen=True, eq=False)
class Lines:
    """A line list; arrays have one entry per line."""

    position: NDArray[np.float64]
    """In the unit of the axis, ascending."""
    intensity: NDArray[np.float64]
    """Sums to 1."""
    groups: tuple[str, ...]
    twice_m: NDArray[np.int16] | None
    """2m per line and group, `ABSENT` where there is none; None if lines were joined."""
    system: NDArray[np.intp]
    """Which of `systems` a line belongs to."""
    systems: tuple[SpinSystem, ...]
    sweep: Sweep
    """The experiment; g is that of the first system."""
    notes: tuple[str, ...]
    """How the positions were found, and what to know about them: sentences."""

    @property
    def axis(self) -> str:
        """`field_mT` or `frequency_MHz`."""
        return self.sweep.axis

    @property
    def combinations(self) -> int | None:
        """Number of different combinations of system and m_I; None if lines were joined."""
        if self.twice_m is None:
            return None
        return len(np.unique(np.column_stack([self.system, self.twice_m]), axis=0))

    def __len__(self) -> int:
        return len(self.position)


def line_list(
    systems: Sequence[tuple[SpinSystem, float]],
    *,
    frequency_MHz: float | None = None,
    field_mT: float | None = None,
    width_mT: float,
    order: str = "auto",
) -> Lines:
    """The lines of spin systems with weights, field swept at a frequency or frequency swept at a field.

    `order` "auto" diagonalises where second order could be seen (a*a/(2 B0) above 1 % of `width_mT`) and the
    nuclei's product space has at most 1024 states, and takes second order otherwise. Raises InputError for an
    electron spin above 1/2 and for widths and weights that are not positive.
    """
    require_choice("order", order, ORDERS)
    if not width_mT > 0:
        raise InputError(f"the peak-to-peak width must be positive, found {width_mT} mT")
    if any(not weight > 0 for _, weight in systems):
        raise InputError("every weight must be positive")
    parts = [
        _of_one(system, Sweep(system.g_iso, frequency_MHz, field_mT), width_mT, order)
        for system, _ in systems
    ]
    total = sum(weight for _, weight in systems)
    groups = tuple(dict.fromkeys(name for part in parts for name in part.groups))
    labelled = all(part.twice_m is not None for part in parts)
    position = np.concatenate([part.position for part in parts])
    sorting = np.argsort(position, kind="stable")
    shares = [weight / total for _, weight in systems]
    intensity = np.concatenate([part.intensity * share for part, share in zip(parts, shares, strict=True)])
    return Lines(
        sweep=parts[0].sweep,
        position=position[sorting],
        intensity=intensity[sorting],
        groups=groups,
        twice_m=np.concatenate([_widened(part, groups) for part in parts])[sorting] if labelled else None,
        system=np.concatenate([np.full(len(part), k) for k, part in enumerate(parts)])[sorting],
        systems=tuple(system for system, _ in systems),
        notes=tuple(_said_once(parts)),
    )


def _said_once(parts: Sequence[Lines]) -> list[str]:
    """The notes of all systems; how positions were found is said once for all that share it."""
    shared: dict[str, list[str]] = {}
    for part in parts:
        shared.setdefault(part.notes[0], []).append(part.systems[0].name)
    first = [
        f"{names[0] if len(names) == 1 else f'all {len(names)} systems' if len(shared) == 1 else ', '.join(names)}"
        f": {note}"
        for note, names in shared.items()
    ]
    return first + [note for part in parts for note in part.notes[1:]]


def splittings_of(system: SpinSystem) -> list[Splitting]:
    """The groups of a system as the numerics take them."""
    return [
        Splitting(
            twice_spin=round(2 * group.nuclear_spin),
            count=group.count,
            coupling_MHz=group.a_iso_MHz,
            nuclear_g=isotope(group.isotope).nuclear_g,
        )
        for group in system.groups
    ]


def lines_csv(lines: Lines) -> str:
    """Columns `field_mT` (or `frequency_MHz`), `intensity`, one `m_I_<group>` per group, and, where there
    are several systems, `radical` and `isotopologue`. A group that a line does not have is empty."""
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    several = len(lines.systems) > 1
    writer.writerow(
        [lines.axis, "intensity", *(f"m_I_{name}" for name in lines.groups)]
        + (["radical", "isotopologue"] if several else [])
    )
    numbers = zip(lines.position.tolist(), lines.intensity.tolist(), strict=True)
    labels = None if lines.twice_m is None else lines.twice_m.tolist()
    for row, (position, intensity) in enumerate(numbers):
        quanta = [""] * len(lines.groups) if labels is None else [_half(twice) for twice in labels[row]]
        system = lines.systems[lines.system[row]]
        names = [system.radical, system.isotopologue] if several else []
        writer.writerow([position, intensity, *quanta, *names])
    return buffer.getvalue()


def _half(twice_m: int) -> str:
    return "" if twice_m == ABSENT else str(twice_m / 2)


def _widened(part: Lines, groups: tuple[str, ...]) -> NDArray[np.int16]:
    """The labels of a part under the columns of all parts."""
    assert part.twice_m is not None
    wide = np.full((len(part), len(groups)), ABSENT, dtype=np.int16)
    for column, name in enumerate(part.groups):
        wide[:, groups.index(name)] = part.twice_m[:, column]
    return wide


def _of_one(system: SpinSystem, sweep: Sweep, width_mT: float, order: str) -> Lines:
    if system.electron_spin != 0.5:
        raise InputError(
            f"{system.radical} has S = {system.electron_spin:g}: its spectrum needs zero-field splitting, "
            "which is not computed here; spectra are for S = 1/2 (`unpaired export` hands the couplings over)"
        )
    everything = splittings_of(system)
    names = tuple(group.group for group in system.groups)
    taken, reason = _choice(everything, sweep, width_mT, order)
    notes = [reason]
    active = [k for k, one in enumerate(everything) if abs(one.coupling_MHz) >= NO_SPLITTING_MHz]
    idle = [name for k, name in enumerate(names) if k not in active]
    if idle:
        notes.append(
            f"{system.name}: {', '.join(idle)} split nothing (zero coupling); their m_I is left empty"
        )
    together = [[k] for k in active] if taken == "first" else _joined_equals(system, everything, active)
    for members in together:
        if len(members) > 1:
            notes.append(
                f"{system.name}: {', '.join(names[k] for k in members)} have equal couplings and are treated "
                f"as one group; their common m_I stands under {names[members[0]]}"
            )
    joined = [
        replace(everything[members[0]], count=sum(everything[k].count for k in members))
        for members in together
    ]
    if taken == "second":
        for j, k in close_pairs(joined, sweep):
            notes.append(
                f"{system.name}: the couplings of {names[together[j][0]]} and {names[together[k][0]]} are so "
                "close that second order mixes them; their fine structure is approximate (order exact has it)"
            )
    position, intensity, twice_m = _positions(joined, sweep, width_mT, taken)
    if position.min() <= 0:
        raise InputError(
            f"{system.name}: the couplings are too large for {_WORDS[taken]} here (it puts lines below zero); take a "
            "higher frequency or field, or order exact"
        )
    if twice_m is None:
        notes.append(f"{system.name}: too many lines to name; close ones are joined and m_I is left empty")
        labels = None
    else:
        labels = np.full((len(position), len(names)), ABSENT, dtype=np.int16)
        for column, members in enumerate(together):
            labels[:, members[0]] = twice_m[:, column]
    return Lines(
        sweep=sweep,
        position=position,
        intensity=intensity,
        groups=names,
        twice_m=labels,
        system=np.zeros(len(position), dtype=np.intp),
        systems=(system,),
        notes=tuple(notes),
    )


def _choice(splittings: Sequence[Splitting], sweep: Sweep, width_mT: float, order: str) -> tuple[str, str]:
    """The order to take, and a sentence that says why."""
    size = second_order_size_mT(splittings, sweep)
    states = math.prod(s.states for s in splittings if abs(s.coupling_MHz) >= NO_SPLITTING_MHz)
    compared = f"a*a/(2 B0) = {size:.2g} mT, width {width_mT:g} mT"
    if order == "exact" and states > EXACT_STATES:
        raise InputError(
            f"exact line positions are for at most {EXACT_STATES} nuclear states, here are {states}: "
            "take second order"
        )
    if order != "auto":
        return order, f"line positions of {_WORDS[order]}, as asked for ({compared})"
    if size <= NEGLIGIBLE_SHARE_OF_WIDTH * width_mT:
        return "second", f"line positions of second order: {compared}, exact ones would look the same"
    if states <= EXACT_STATES:
        return "exact", f"exact line positions by diagonalisation: {compared}, {states} nuclear states"
    reason = (
        f"line positions of second order: {compared}, {_number(states)} nuclear states are too many for exact"
    )
    left_out = third_order_size_mT(splittings, sweep)
    if left_out > NEGLIGIBLE_SHARE_OF_WIDTH * width_mT:
        reason += f"; what it leaves out is of the size of {left_out:.2g} mT"
    return "second", reason


_WORDS = {"exact": "exact diagonalisation", "second": "second order", "first": "first order"}


def _number(states: int) -> str:
    return str(states) if states < 10**9 else f"about 10^{len(str(states)) - 1}"


def _joined_equals(
    system: SpinSystem, splittings: Sequence[Splitting], active: Sequence[int]
) -> list[list[int]]:
    """Groups of one isotope with equal couplings flip together: places of those to be treated as one."""
    together: list[list[int]] = []
    for k in active:
        for members in together:
            first = members[0]
            if (
                system.groups[first].isotope == system.groups[k].isotope
                and abs(splittings[first].coupling_MHz - splittings[k].coupling_MHz) < EQUAL_MHz
            ):
                members.append(k)
                break
        else:
            together.append([k])
    return together


def _positions(
    splittings: Sequence[Splitting], sweep: Sweep, width_mT: float, order: str
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.int16] | None]:
    """Positions, intensities and 2m per group; 2m is None if lines had to be joined."""
    if order == "exact":
        return exact_lines(splittings, sweep)
    position, intensity = np.array([sweep.centre]), np.ones(1)
    twice_m: NDArray[np.int16] | None = np.empty((1, len(splittings)), dtype=np.int16)
    displaced = second_order if order == "second" else first_order
    for k, splitting in enumerate(splittings):
        offsets, shares, quanta = displaced(splitting, sweep)
        position = np.add.outer(position, offsets).ravel()
        intensity = np.multiply.outer(intensity, shares).ravel()
        if twice_m is not None and len(position) <= MOST_LABELLED:
            twice_m = np.repeat(twice_m, len(offsets), axis=0)
            twice_m[:, k] = np.tile(quanta, len(twice_m) // len(offsets))
        else:
            twice_m = None
            cell = JOIN_SHARE_OF_WIDTH * width_mT * sweep.axis_per_mT
            position, intensity = joined_lines(position, intensity, cell)
    return position, intensity, twice_m


def joined_lines(
    position: NDArray[np.float64], intensity: NDArray[np.float64], cell: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Lines of one cell joined at their centre of gravity: total intensity and first moment stay."""
    _, place = np.unique(np.floor(position / cell), return_inverse=True)
    weight = np.bincount(place, weights=intensity).astype(np.float64)
    centre = np.bincount(place, weights=intensity * position) / weight
    return centre, weight
