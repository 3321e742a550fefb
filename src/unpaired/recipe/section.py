"""One mapping of a recipe, asked key by key; what does not fit is noted as a problem, never raised."""

from __future__ import annotations

import math
from collections.abc import Sequence

from ..errors import nearest
from .document import Node, NodeList, NodeMap, Problems, Scalar, found


class Section:
    """Typed access to a mapping. Every method returns None for a key that is missing or was refused."""

    def __init__(self, node: NodeMap, address: str, problems: Problems, keys: Sequence[str]) -> None:
        self.node = node
        self.address = address
        self.problems = problems
        self.refused: set[str] = set()
        """Keys whose value was refused: nothing that depends on them needs a second complaint."""
        for key, entry in node.entries.items():
            if key not in keys:
                units = (
                    " (convert the number: 1 mT = 10 G = 28.025 MHz)" if key.startswith("coupling_") else ""
                )
                problems.add(
                    entry.line,
                    self.key(key),
                    f"unknown key{nearest(key, keys)}{units}; allowed: {', '.join(keys)}; found: {key}",
                )

    def key(self, name: str) -> str:
        """The address of a key inside the recipe."""
        return f"{self.address}.{name}" if self.address else name

    def __contains__(self, name: str) -> bool:
        return name in self.node.entries

    def line(self, name: str) -> int:
        """The line of a key, or of the mapping if the key is missing."""
        entry = self.node.entries.get(name)
        return entry.line if entry else self.node.line

    def refuse(self, name: str, sentence: str, line: int | None = None) -> None:
        """Note a problem with a key."""
        self.refused.add(name)
        self.problems.add(self.line(name) if line is None else line, self.key(name), sentence)

    def require(self, name: str, allowed: str) -> bool:
        """False, and a problem, if the key is missing."""
        if name in self.node.entries:
            return True
        self.refuse(name, f"is missing; allowed: {allowed}; found: nothing")
        return False

    def get(self, name: str, what: str, allowed: str) -> Node | None:
        """The node of a key that is there and not empty."""
        entry = self.node.entries.get(name)
        if entry is None:
            return None
        if isinstance(entry.node, Scalar) and entry.node.value is None:
            self.refuse(name, f"is not {what}; allowed: {allowed}; found: nothing")
            return None
        return entry.node

    def _wrong(self, name: str, node: Node, what: str, allowed: str) -> None:
        self.refuse(name, f"is not {what}; allowed: {allowed}; found: {found(node)}", node.line)

    def text(self, name: str, allowed: str = "text on one line") -> str | None:
        """Text; what looks like a number or a boolean is taken as it is written."""
        node = self.get(name, "text", allowed)
        if node is None:
            return None
        if not isinstance(node, Scalar) or not node.text.strip() or "\n" in node.text.strip():
            self._wrong(name, node, "text", allowed)
            return None
        return node.text

    def integer(self, name: str, allowed: str) -> int | None:
        """A whole number."""
        node = self.get(name, "a whole number", allowed)
        if node is None:
            return None
        value = node.value if isinstance(node, Scalar) else None
        if isinstance(value, float) and value.is_integer():
            value = int(value)
        if isinstance(value, bool) or not isinstance(value, int):
            self._wrong(name, node, "a whole number", allowed)
            return None
        return value

    def number(self, name: str, allowed: str) -> float | None:
        """A finite number."""
        node = self.get(name, "a number", allowed)
        if node is None:
            return None
        value = node.value if isinstance(node, Scalar) else None
        if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
            self._wrong(name, node, "a number", allowed)
            return None
        return float(value)

    def boolean(self, name: str, default: bool) -> bool:
        """`true` or `false`."""
        node = self.get(name, "a yes-or-no value", "true or false")
        if node is None:
            return default
        if not isinstance(node, Scalar) or not isinstance(node.value, bool):
            self._wrong(name, node, "a yes-or-no value", "true or false")
            return default
        return node.value

    def choice(self, name: str, allowed: Sequence[str], default: str | None) -> str | None:
        """One of a few words, read without regard to case."""
        text = self.text(name, ", ".join(allowed))
        if text is None:
            return default
        for word in allowed:
            if word.casefold() == text.casefold():
                return word
        self.refuse(
            name, f'does not exist{nearest(text, allowed)}; allowed: {", ".join(allowed)}; found: "{text}"'
        )
        return None

    def section(self, name: str, keys: Sequence[str], allowed: str) -> Section | None:
        """A mapping inside this one."""
        node = self.get(name, "a mapping", allowed)
        if node is None:
            return None
        if not isinstance(node, NodeMap):
            self._wrong(name, node, "a mapping", allowed)
            return None
        return Section(node, self.key(name), self.problems, keys)

    def items(self, name: str, allowed: str) -> tuple[Node, ...] | None:
        """A list with at least one item."""
        node = self.get(name, "a list", allowed)
        if node is None:
            return None
        if not isinstance(node, NodeList):
            self._wrong(name, node, "a list", allowed)
            return None
        if not node.items:
            self.refuse(name, f"is an empty list; allowed: {allowed}; found: []")
            return None
        return node.items

    def sections(self, name: str, keys: Sequence[str], allowed: str) -> list[Section]:
        """A list of mappings; items of another form are refused and left out."""
        sections = []
        for place, node in enumerate(self.items(name, allowed) or (), start=1):
            address = f"{self.key(name)}[{place}]"
            if isinstance(node, NodeMap):
                sections.append(Section(node, address, self.problems, keys))
            else:
                self.refused.add(name)
                self.problems.add(
                    node.line, address, f"is not a mapping; allowed: {allowed}; found: {found(node)}"
                )
        return sections
