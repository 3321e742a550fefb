"""What a recipe says about the experiment: temperature, g, measured splittings."""

from __future__ import annotations

from .nuclear import Atoms, read_labels
from .recipe import Measured, MeasuredG, Sign
from .section import Section

MEASURED_KEYS = ("atoms", "count", "coupling_mT", "sign", "source")
G_KEYS = ("value", "source")
SIGNS: tuple[Sign, ...] = ("+", "-", "unknown")
SOURCE = "text that says where the value comes from"


def read_temperature(recipe: Section) -> float | None:
    """The temperature of the experiment, None if the recipe does not name it."""
    allowed = "a number above 0, in kelvin"
    value = recipe.number("temperature_K", allowed)
    if value is not None and value <= 0:
        recipe.refuse("temperature_K", f"is not positive; allowed: {allowed}; found: {value:g}")
        return None
    return value


def read_g(recipe: Section) -> MeasuredG | None:
    """The measured g."""
    section = recipe.section("g", G_KEYS, "{value: 2.0026, source: ...}")
    if section is None:
        return None
    value = source = None
    if section.require("value", "a number above 0"):
        value = section.number("value", "a number above 0")
    if value is not None and value <= 0:
        section.refuse("value", f"is not positive; allowed: a number above 0; found: {value:g}")
    if section.require("source", SOURCE):
        source = section.text("source", SOURCE)
    return MeasuredG(value, source) if value and source else None


def read_measured(recipe: Section, atoms: Atoms | None) -> tuple[Measured, ...]:
    """The measured splittings. Without a readable structure the labels are not looked at."""
    allowed = "a list such as [{atoms: [H3, H4], count: 2, coupling_mT: 1.74, source: ...}]"
    values: list[Measured] = []
    taken: dict[str, int] = {}
    for place, section in enumerate(recipe.sections("measured", MEASURED_KEYS, allowed), start=1):
        labels = None
        if "atoms" in section and atoms is not None:
            node = section.get(
                "atoms", "a list of atoms", "labels such as [H2, H3]; leave it out if unassigned"
            )
            labels = read_labels(recipe, section.key("atoms"), node, atoms) if node else None
        for label in labels or ():
            if label in taken:
                section.refuse(
                    "atoms",
                    f"{label} has a splitting in measured[{taken[label]}] already; "
                    "allowed: one splitting per nucleus",
                )
            taken.setdefault(label, place)
        count = _count(section, labels)
        coupling, sign = _coupling(section)
        source = None
        if section.require("source", SOURCE):
            source = section.text("source", SOURCE)
        if count is not None and coupling is not None and sign is not None and source:
            values.append(Measured(labels, count, coupling, sign, source))
    return tuple(values)


def _count(section: Section, labels: tuple[str, ...] | None) -> int | None:
    allowed = "the number of equivalent nuclei, from 1 upwards"
    if "count" not in section:
        if labels is not None:
            return len(labels)
        if "atoms" not in section:
            section.require("count", allowed)
        return None
    count = section.integer("count", allowed)
    if count is None:
        return None
    if count < 1:
        section.refuse("count", f"is not positive; allowed: {allowed}; found: {count}")
        return None
    if labels is not None and count != len(labels):
        section.refuse(
            "count",
            f"does not fit `atoms`; allowed: {len(labels)}, the number of atoms listed; found: {count}",
        )
        return None
    return count


def _coupling(section: Section) -> tuple[float | None, Sign | None]:
    sign: Sign | None = "unknown"
    text = section.choice("sign", SIGNS, "unknown")
    sign = next((known for known in SIGNS if known == text), None)
    if not section.require("coupling_mT", "a number in mT"):
        return None, sign
    value = section.number("coupling_mT", "a number in mT")
    if value is None or sign is None:
        return None, sign
    if value < 0 and sign == "unknown":
        section.refuse(
            "coupling_mT",
            "is negative while its sign is unknown; allowed: a value of at least 0, or "
            f'sign: "-" if the sign is known; found: {value:g}',
        )
        return None, sign
    if value < 0 and sign == "+":
        section.refuse(
            "coupling_mT", f'contradicts sign: "+"; allowed: a value of at least 0; found: {value:g}'
        )
        return None, sign
    return (-abs(value) if sign == "-" else value), sign
