"""The printed view of a result: levels side by side, one row per group, findings beside the numbers."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence

from .constants import MHZ_PER_MT
from .layout import layout
from .result import Result, Row

MARKS = {"bad": "!!", "caution": "! ", "note": "  "}
MARK_MEANING = "!! do not use this number   ! look at the findings first"


def coupling_report(result: Result) -> str:
    """Couplings of every group in mT, MHz in brackets, one column per level; measured values last."""
    levels = result.level_ids
    measured = _measured_per_group(result)
    head = ["group", "nuclei", "isotope", *levels] + (["measured"] if measured else [])
    lines = []
    for label in dict.fromkeys(row["group"] for row in result.rows("couplings", levels[0])):
        members = [row for row in result.rows("couplings", levels[0]) if row["group"] == label]
        cells = [label, _places(members), members[0]["isotope"] or "-"]
        for level in levels:
            rows = [row for row in result.rows("couplings", level) if row["group"] == label]
            cells.append(_coupling(rows, _worst(result, level, {row["atom"] for row in rows})))
        if measured:
            cells.append(measured.get(label, ""))
        lines.append(cells)
    unassigned = [item for item in result.recipe["measured"] if not item["atoms"]]
    text = layout(head, lines, left=3)
    if "|" in text or unassigned:
        text += "|x|: measured with unknown sign, a magnitude\n"
    for item in unassigned:
        text += f"measured, not assigned: {item['count']} x {_measured(item)} mT\n"
    return text


def state_report(result: Result) -> str:
    """Energy, <S^2> and what became of every level."""
    head = ["level", "energy / Eh", "<S^2>", "exact", "stable", "iterations", "time / s", "findings"]
    lines = []
    for row in result.rows("states"):
        stable = {True: "yes", False: "no", None: "not tested"}[row["stable"]]
        if not row["converged"]:
            lines.append([row["level"], "failed", "", "", "", "", "", row["flags"].replace(";", " ")])
            continue
        lines.append(
            [
                row["level"],
                f"{row['energy_Eh']:.6f}",
                f"{row['s_squared']:.4f}",
                f"{row['s_squared_exact']:.4f}",
                stable,
                str(row["iterations"]),
                f"{row['wall_s']:.1f}",
                row["flags"].replace(";", " "),
            ]
        )
    return layout(head, lines, left=1, left_last=True)


def flag_report(result: Result) -> str:
    """Every finding once: where, value against limit, and what to do."""
    lines = []
    seen: dict[tuple[str, str, str], list[Row]] = {}
    for row in result.rows("flags"):
        seen.setdefault((row["code"], row["severity"], row["advice"]), []).append(row)
    order = {"bad": 0, "caution": 1, "note": 2}
    for (code, severity, advice), rows in sorted(seen.items(), key=lambda item: order[item[0][1]]):
        places = [_place(row) for row in rows]
        head = f"{MARKS[severity]} {code} ({severity}): {'; '.join(dict.fromkeys(places))}"
        lines.append(_wrapped(head, "       ") + "\n" + _wrapped(f"     {advice}", "     "))
    return "\n".join(lines) + "\n" if lines else ""


def full_report(result: Result) -> str:
    """Everything that `unpaired run` prints about one radical."""
    recipe = result.recipe
    solvent = recipe.get("solvent")
    medium = (
        f"in {solvent['name']} (dielectric constant {solvent['dielectric']:g})" if solvent else "gas phase"
    )
    head = f"{result.radical}   charge {recipe['charge']:+d}   2S+1 = {recipe['multiplicity']}   {medium}\n"
    averaged = any(row.get("a_averaged_mT") is not None for row in result.rows("couplings"))
    over = ""
    if averaged:
        source = "assumed, the recipe names none" if recipe["temperature_assumed"] else "from the recipe"
        over = f",\nand over the conformers of conformers.csv at {recipe['temperature_K']:g} K ({source})"
    parts = [
        head.replace("+0", "0"),
        f"couplings in mT (MHz), mean of each group of equivalent nuclei{over}",
    ]
    parts += [coupling_report(result), state_report(result)]
    findings = flag_report(result)
    if findings:
        parts += [f"findings   ({MARK_MEANING})", findings]
    return "\n".join(parts)


def _wrapped(text: str, indent: str) -> str:
    """Sentences broken at 110 characters; tables are never broken."""
    return textwrap.fill(text, 110, subsequent_indent=indent, break_long_words=False, break_on_hyphens=False)


def _place(row: Row) -> str:
    where = row["level"] or "all levels"
    if row["atom"]:
        where += f" {row['atom']}"
    if row["value"] is not None and row["limit"] is not None:
        where += f" {row['value']:.3g} (limit {row['limit']:.3g})"
    return where


def _coupling(rows: Sequence[Row], severity: str) -> str:
    if not rows or rows[0]["a_group_mT"] is None:
        return "-   "
    field = shown_mT(rows[0])
    return f"{_signed(field, 3)} ({_signed(field * MHZ_PER_MT, 1)}) {MARKS[severity]}"


def shown_mT(row: Row) -> float:
    """The value that a spectrum would show: averaged over conformers where there are several, else the group's."""
    averaged = row.get("a_averaged_mT")
    return float(row["a_group_mT"] if averaged is None else averaged)


def _signed(value: float, digits: int) -> str:
    text = f"{value:+.{digits}f}"
    return text.replace("+", " ") if float(text) == 0 else text


def _worst(result: Result, level: str, atoms: set[str]) -> str:
    found = [
        row["severity"]
        for row in result.rows("flags")
        if row["level"] in (None, level) and (row["atom"] is None or row["atom"] in atoms)
    ]
    return min(found, key=("bad", "caution", "note").index, default="note")


def _places(rows: Sequence[Row]) -> str:
    """`3 (H2 H3 H4)` or `1`."""
    return f"{len(rows)} ({' '.join(row['atom'] for row in rows)})" if len(rows) > 1 else "1"


def _measured_per_group(result: Result) -> dict[str, str]:
    group_of = {row["atom"]: row["group"] for row in result.rows("couplings")}
    found: dict[str, list[str]] = {}
    for item in result.recipe["measured"]:
        for group in dict.fromkeys(group_of[atom] for atom in item["atoms"] or ()):
            found.setdefault(group, []).append(_measured(item))
    return {group: " / ".join(values) for group, values in found.items()}


def _measured(item: Row) -> str:
    return f"|{item['coupling_mT']:g}|" if item["sign"] == "unknown" else f"{item['coupling_mT']:+g}"
