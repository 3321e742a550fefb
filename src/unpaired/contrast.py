"""Levels side by side, group by group: what is direct, what is polarisation, and where the measured value lies."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from .errors import InputError
from .layout import layout
from .result import Result, Row

ORDER = ("ROHF", "UHF projected", "UHF", "ROKS", "UKS")
"""Treatments from no polarisation to all of it."""
COLUMNS = (
    "radical",
    "group",
    "isotope",
    "group_size",
    "treatment",
    "level",
    "coupling_mT",
    "direct_mT",
    "polarisation_mT",
    "sign",
    "measured_within",
    "rule",
)
"""Of the tidy file: one row per group and treatment, and one per measured value and UHF level."""
LARGEST_PAIRS = 3


@dataclass(frozen=True)
class Value:
    """A group's coupling in one treatment, mean over the group."""

    treatment: str
    """One of ORDER."""
    level: str
    """Level id, with the place of the result before it where ids would be ambiguous."""
    coupling_mT: float
    direct_mT: float | None
    """None for a projected value: projection is not split."""
    polarisation_mT: float | None

    @property
    def title(self) -> str:
        """Level id, with a word where it is projected."""
        return f"{self.level} projected" if self.treatment == "UHF projected" else self.level


@dataclass(frozen=True)
class Known:
    """A measured value of a group."""

    coupling_mT: float
    signed: bool


@dataclass(frozen=True)
class Bracket:
    """Whether a measured value lies between projected and plain UHF of one level."""

    level: str
    measured: Known
    within: bool
    rule: str
    """How it was compared."""


@dataclass(frozen=True)
class Contrast:
    """One group of equivalent nuclei in every treatment."""

    radical: str
    group: str
    isotope: str
    nuclei: tuple[str, ...]
    values: tuple[Value, ...]
    """In the order of ORDER."""
    measured: tuple[Known, ...]
    pairs: Mapping[str, tuple[str, ...]]
    """Per unrestricted level the largest contributions to the first nucleus, in words."""

    @property
    def brackets(self) -> tuple[Bracket, ...]:
        """For every UHF level and measured value."""
        plain = {value.level: value.coupling_mT for value in self.values if value.treatment == "UHF"}
        return tuple(
            bracket(value.level, value.coupling_mT, plain[value.level], known)
            for value in self.values
            if value.treatment == "UHF projected"
            for known in self.measured
        )


def contrast(results: Sequence[Result], names: Sequence[str]) -> tuple[Contrast, ...]:
    """Groups that all results have in common, with the values of all their levels.

    `names` tells the results apart, one per result. A group is the same if label, isotope and number of nuclei
    are. Raises InputError if there is no such group, or if not a single level gave numbers.
    """
    keys = [{_key(row): None for row in result.rows("couplings") if row["isotope"]} for result in results]
    common = [key for key in keys[0] if all(key in other for other in keys)]
    if not common:
        raise InputError(
            f"{', '.join(names)}: have no group of equivalent nuclei in common (same label, isotope and "
            "number); contrast results of one radical"
        )
    ids = [level for result in results for level in result.level_ids]
    found = []
    for key in common:
        values: list[Value] = []
        pairs: dict[str, tuple[str, ...]] = {}
        for result, name in zip(results, names, strict=True):
            for level in result.level_ids:
                rows = [row for row in result.rows("couplings", level) if _key(row) == key]
                title = level if ids.count(level) == 1 else f"{name} {level}"
                values += _values(rows, title)
                words = largest_pairs(result, level, rows[0]["atom"])
                if words:
                    pairs[title] = words
        values.sort(key=lambda value: ORDER.index(value.treatment))
        members = [row for row in results[0].rows("couplings", results[0].level_ids[0]) if _key(row) == key]
        measured = dict.fromkeys(
            known for result in results for known in _known(result, {row["atom"] for row in members})
        )
        found.append(
            Contrast(
                radical=results[0].radical,
                group=key[0],
                isotope=key[1],
                nuclei=tuple(row["atom"] for row in members),
                values=tuple(values),
                measured=tuple(measured),
                pairs=pairs,
            )
        )
    if not any(entry.values for entry in found):
        raise InputError(f"{', '.join(names)}: no level gave numbers, there is nothing to contrast")
    return tuple(found)


def column_titles(contrasts: Sequence[Contrast]) -> tuple[str, ...]:
    """Titles of all values of all groups, in the order of ORDER."""
    place = {value.title: ORDER.index(value.treatment) for entry in contrasts for value in entry.values}
    return tuple(sorted(place, key=lambda title: place[title]))


def bracket(level: str, projected_mT: float, plain_mT: float, known: Known) -> Bracket:
    """Whether a measured value lies between projected and plain UHF, and by which rule that was judged."""
    low, high = sorted((projected_mT, plain_mT))
    if known.signed:
        return Bracket(level, known, low <= known.coupling_mT <= high, "signed values")
    least = 0.0 if low < 0 < high else min(abs(low), abs(high))
    within = least <= abs(known.coupling_mT) <= max(abs(low), abs(high))
    return Bracket(level, known, within, "magnitudes, the sign is unknown")


def largest_pairs(result: Result, level: str, atom: str) -> tuple[str, ...]:
    """The largest contributions of localised pairs to an atom, such as `valence pair on C1-H4: -1.90 mT`."""
    rows = [row for row in result.rows("polarisation", level) if row["atom"] == atom]
    rows.sort(key=lambda row: -abs(row["contribution_mT"]))
    return tuple(
        f"{row['kind']} pair on {row['pair']}: {row['contribution_mT']:+.2f} mT"
        for row in rows[:LARGEST_PAIRS]
    )


def tidy_rows(contrasts: Iterable[Contrast]) -> list[Row]:
    """Rows of the tidy file; the columns are COLUMNS."""
    rows: list[Row] = []
    for entry in contrasts:
        start: dict[str, Any] = {
            "radical": entry.radical,
            "group": entry.group,
            "isotope": entry.isotope,
            "group_size": len(entry.nuclei),
        }
        for value in entry.values:
            rows.append(
                start
                | {
                    "treatment": value.treatment,
                    "level": value.level,
                    "coupling_mT": value.coupling_mT,
                    "direct_mT": value.direct_mT,
                    "polarisation_mT": value.polarisation_mT,
                    "sign": "computed",
                }
            )
        for known in entry.measured:
            stated = {
                "treatment": "measured",
                "coupling_mT": known.coupling_mT,
                "sign": "known" if known.signed else "unknown",
            }
            judged = [judgement for judgement in entry.brackets if judgement.measured == known]
            for judgement in judged:
                rows.append(
                    start
                    | stated
                    | {"level": judgement.level, "measured_within": judgement.within, "rule": judgement.rule}
                )
            if not judged:
                rows.append(start | stated)
    return rows


def contrast_report(contrasts: Sequence[Contrast]) -> str:
    """What `unpaired contrast` prints."""
    head = ["group", "nuclei", "isotope"]
    titles = column_titles(contrasts)
    lines = []
    for entry in contrasts:
        of = {value.title: _field(value.coupling_mT) for value in entry.values}
        measured = " ".join(_known_words(known) for known in entry.measured)
        cells = [of.get(title, "") for title in titles]
        lines.append([entry.group, _nuclei(entry), entry.isotope, *cells, measured])
    text = f"{contrasts[0].radical}   couplings in mT, mean of each group of equivalent nuclei\n\n"
    text += layout([*head, *titles, "measured"], lines, left=3)
    text += "\n" + _part_report(contrasts) + _bracket_report(contrasts) + _pair_report(contrasts)
    return text.rstrip("\n") + "\n"


def _part_report(contrasts: Sequence[Contrast]) -> str:
    lines = [
        [
            entry.group,
            value.level,
            *map(_field, (value.direct_mT, value.polarisation_mT, value.coupling_mT)),
        ]
        for entry in contrasts
        for value in entry.values
        if value.treatment in ("UHF", "UKS") and value.direct_mT is not None
    ]
    text = ""
    if lines:
        text = "direct part and spin polarisation in mT\n"
        text += layout(["group", "level", "direct", "polarisation", "sum"], lines, left=2)
    if any(value.treatment in ("ROHF", "ROKS") for entry in contrasts for value in entry.values):
        text += "ROHF and ROKS are all direct: their polarisation is zero by construction.\n"
    return text + "\n" if text else ""


def _bracket_report(contrasts: Sequence[Contrast]) -> str:
    lines = []
    for entry in contrasts:
        for judgement in entry.brackets:
            lies = "between" if judgement.within else "outside"
            lines.append(
                [entry.group, judgement.level, _known_words(judgement.measured), lies, judgement.rule]
            )
    if not lines:
        return ""
    head = ["group", "level", "measured", "projected .. plain UHF", "compared by"]
    return "measured value against projected and plain UHF\n" + layout(head, lines, left=5) + "\n"


def _pair_report(contrasts: Sequence[Contrast]) -> str:
    lines = []
    for entry in contrasts:
        for level, words in entry.pairs.items():
            lines.append([entry.nuclei[0], level, "; ".join(words)])
    if not lines:
        return ""
    text = "largest contributions of spin polarisation to the first nucleus of each group\n"
    return text + layout(["atom", "level", "pairs"], lines, left=3)


def _key(row: Row) -> tuple[str, str, int]:
    return row["group"], row["isotope"], row["group_size"]


def _values(rows: Sequence[Row], title: str) -> list[Value]:
    """The values of one group at one level; none if the level failed."""
    first = rows[0]
    if first["a_group_mT"] is None:
        return []
    direct, polarisation = (
        float(np.mean([row[name] for row in rows])) if first[name] is not None else None
        for name in ("direct_mT", "polarisation_mT")
    )
    found = [Value(first["scf"], title, first["a_group_mT"], direct, polarisation)]
    if first["a_group_projected_mT"] is not None:
        found.append(Value("UHF projected", title, first["a_group_projected_mT"], None, None))
    return found


def _known(result: Result, atoms: set[str]) -> list[Known]:
    return [
        Known(item["coupling_mT"], item["sign"] != "unknown")
        for item in result.recipe["measured"]
        if item["atoms"] and atoms & set(item["atoms"])
    ]


def _field(coupling_mT: float | None) -> str:
    """Three digits, zero without a sign, empty for None."""
    if coupling_mT is None:
        return ""
    text = f"{coupling_mT:+.3f}"
    return "0.000" if float(text) == 0 else text


def _known_words(known: Known) -> str:
    return f"{known.coupling_mT:+g}" if known.signed else f"|{known.coupling_mT:g}|"


def _nuclei(entry: Contrast) -> str:
    count = len(entry.nuclei)
    return str(count) if count == 1 else f"{count} ({' '.join(entry.nuclei)})"
