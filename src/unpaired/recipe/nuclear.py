"""What a recipe says about its nuclei: isotopes and groups."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from .. import nuclei
from ..errors import ChoiceError, nearest
from .document import Node, NodeList, NodeMap, Scalar, found
from .section import Section


class Atoms:
    """The atoms of the molecule by label, with their isotopes."""

    def __init__(self, elements: Sequence[str]) -> None:
        self.element = {f"{element}{place}": element for place, element in enumerate(elements, start=1)}
        self.isotope: dict[str, str | None] = {}
        for label, element in self.element.items():
            isotope = nuclei.table_isotope(element)
            self.isotope[label] = isotope.name if isotope else None

    def unknown(self, label: str) -> str | None:
        """The sentence for a label that is not in the molecule."""
        if label in self.element:
            return None
        labels = tuple(self.element)
        listed = ", ".join(labels) if len(labels) <= 30 else f"{labels[0]} to {labels[-1]}"
        return f'no such atom in the structure{nearest(label, labels)}; allowed: {listed}; found: "{label}"'


def read_isotopes(recipe: Section, atoms: Atoms, in_file: Mapping[str, str]) -> dict[str, str]:
    """Isotope by label in canonical spelling, also entered into `atoms`.

    `in_file`: isotopes that the structure file names.
    """
    isotopes: dict[str, str] = {}
    for label, stated in in_file.items():
        try:
            isotopes[label] = nuclei.isotope(stated).name
        except ChoiceError as error:
            recipe.refuse("structure", f"{label}: {error.message}")
    node = recipe.get("isotopes", "a mapping", "a mapping such as {C1: 13C}")
    if isinstance(node, NodeMap):
        for label, entry in node.entries.items():
            name = _isotope(recipe, atoms, label, entry.node)
            if name is None:
                continue
            if isotopes.get(label, name) != name:
                recipe.problems.add(
                    entry.line,
                    f"isotopes.{label}",
                    f"the structure says {isotopes[label]}; remove one of the two; found: {name}",
                )
            isotopes[label] = name
    elif node is not None:
        recipe.refuse(
            "isotopes",
            f"is not a mapping; allowed: a mapping such as {{C1: 13C}}; found: {found(node)}",
            node.line,
        )
    atoms.isotope.update(isotopes)
    return isotopes


def _isotope(recipe: Section, atoms: Atoms, label: str, node: Node) -> str | None:
    address = f"isotopes.{label}"
    refusal = atoms.unknown(label)
    if refusal:
        recipe.problems.add(node.line, address, refusal)
        return None
    if not isinstance(node, Scalar) or not 0 < len(node.text.strip()) <= 20:
        recipe.problems.add(
            node.line, address, f"is not an isotope; allowed: a name such as 13C; found: {found(node)}"
        )
        return None
    try:
        isotope = nuclei.isotope(node.text)
    except ChoiceError as error:
        recipe.problems.add(node.line, address, error.message)
        return None
    if isotope.element != atoms.element[label]:
        recipe.problems.add(
            node.line,
            address,
            f"is an isotope of another element; allowed: an isotope of {atoms.element[label]}; "
            f"found: {isotope.name}",
        )
        return None
    return isotope.name


def read_groups(recipe: Section, atoms: Atoms) -> tuple[tuple[str, ...], ...]:
    """Sets of labels of one isotope, without overlap."""
    groups: list[tuple[str, ...]] = []
    taken: dict[str, int] = {}
    allowed = "lists of at least two atom labels, such as [[H2, H3, H4]]"
    for place, node in enumerate(recipe.items("groups", allowed) or (), start=1):
        address = f"groups[{place}]"
        labels = read_labels(recipe, address, node, atoms)
        if labels is None:
            continue
        if len(labels) < 2:
            recipe.problems.add(
                node.line, address, f"a group needs two nuclei; allowed: {allowed}; found: {labels[0]}"
            )
        for label in labels:
            if label in taken:
                recipe.problems.add(
                    node.line,
                    address,
                    f"{label} is in groups[{taken[label]}] already; "
                    "allowed: a nucleus in one group; unite the two",
                )
            taken.setdefault(label, place)
        groups.append(labels)
    return tuple(groups)


def read_labels(recipe: Section, address: str, node: Node, atoms: Atoms) -> tuple[str, ...] | None:
    """Labels that exist, each once, all of one isotope; None with a problem otherwise."""
    if not isinstance(node, NodeList) or not node.items:
        recipe.problems.add(
            node.line,
            address,
            f"is not a list of atoms; allowed: labels such as [H2, H3]; found: {found(node)}",
        )
        return None
    labels: list[str] = []
    good = True
    for item in node.items:
        label = item.text if isinstance(item, Scalar) else None
        sentence = (
            f"is not an atom label; allowed: labels such as H2; found: {found(item)}"
            if label is None
            else atoms.unknown(label)
        )
        if label in labels:
            sentence = f"{label} stands twice in it; keep one"
        if sentence:
            recipe.problems.add(item.line, address, sentence)
            good = False
        elif label is not None:
            labels.append(label)
    if not good:
        return None
    kinds = dict.fromkeys(atoms.isotope[label] for label in labels)
    if len(kinds) > 1:
        listed = ", ".join(
            f"{label} {atoms.isotope[label] or '(no isotope with a spin)'}" for label in labels
        )
        recipe.problems.add(
            node.line, address, f"mixes nuclei; allowed: nuclei of one isotope; found: {listed}"
        )
        return None
    if None in kinds:
        recipe.problems.add(
            node.line,
            address,
            f"{atoms.element[labels[0]]} has no isotope with a spin in the table; remove it",
        )
        return None
    return tuple(labels)
