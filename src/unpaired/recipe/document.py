"""YAML with line numbers, read strictly: the traps of plain YAML are closed here.

Only `true` and `false` are booleans, so that `radical: NO` stays text; numbers are written as in JSON (a
leading plus is allowed, for charges), so that `1e-8` is a number and `012` is not; a key stands once;
anchors, aliases, tags and second documents are refused; nesting and size are bounded. YAML itself is
parsed by PyYAML, whose events are turned into a small tree that remembers the line of everything.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import yaml

MAX_BYTES = 100_000
MAX_DEPTH = 8

_INTEGER = re.compile(r"[+-]?(0|[1-9][0-9]{0,17})")
_NUMBER = re.compile(r"[+-]?(0|[1-9][0-9]{0,17})(\.[0-9]{1,40})?([eE][+-]?[0-9]{1,3})?")
# Control characters, and halves of surrogate pairs, which cannot be written to any file.
_UNUSABLE = re.compile("[\x00-\x08\x0b-\x1f\x7f-\x9f\ud800-\udfff]")


@dataclass(frozen=True)
class Scalar:
    """A single value; `text` is what the file says, `value` how it is understood."""

    line: int
    text: str
    value: str | int | float | bool | None


@dataclass(frozen=True)
class NodeList:
    """A list."""

    line: int
    items: tuple[Node, ...]


@dataclass(frozen=True)
class NodeMap:
    """A mapping; keys are text as written."""

    line: int
    entries: dict[str, Entry]


@dataclass(frozen=True)
class Entry:
    """A value with the line on which its key stands."""

    line: int
    node: Node


Node = Scalar | NodeList | NodeMap


@dataclass
class Problems:
    """Collects every problem of one file, each as `file:line: key: sentence`."""

    file: str
    found: list[tuple[int, str]] = field(default_factory=list)

    def add(self, line: int, key: str, sentence: str) -> None:
        """One problem; `key` is the address inside the recipe, empty for the whole file."""
        address = f"{self.file}:{line}: {key}: " if key else f"{self.file}:{line}: "
        text = address + " ".join(sentence.split())
        if (line, text) not in self.found:
            self.found.append((line, text))

    def sentences(self) -> tuple[str, ...]:
        """In the order of lines."""
        return tuple(text for _, text in sorted(self.found, key=lambda item: item[0]))


class _Unreadable(Exception):
    """The rest of the file cannot be read after this."""

    def __init__(self, line: int, sentence: str) -> None:
        super().__init__(sentence)
        self.line = line
        self.sentence = sentence


def read_document(path: Path, problems: Problems) -> NodeMap | None:
    """The top-level mapping of a YAML file, or None if there is none to go on with.

    Every problem is added to `problems`; nothing is raised.
    """
    try:
        text = _read_text(path)
        node = _parsed(text, problems)
    except _Unreadable as end:
        problems.add(end.line, "", end.sentence)
        return None
    if isinstance(node, NodeMap):
        return node
    what = "a list" if isinstance(node, NodeList) else f'the text "{_short(node.text)}"'
    problems.add(node.line, "", f"is not a recipe; allowed: lines of `key: value`; found: {what}")
    return None


def _read_text(path: Path) -> str:
    try:
        if path.is_dir():
            raise _Unreadable(1, "is a folder; give the recipe file inside it")
        if path.exists() and not path.is_file():
            raise _Unreadable(1, "is not a regular file; give a recipe file")
        with path.open("rb") as file:
            data = file.read(MAX_BYTES + 1)
    except FileNotFoundError:
        raise _Unreadable(1, "there is no such file; check the path") from None
    except OSError as error:
        raise _Unreadable(1, f"cannot be read ({error.strerror or error})") from None
    except ValueError:
        raise _Unreadable(1, "is not a usable path; check the path") from None
    if len(data) > MAX_BYTES:
        raise _Unreadable(
            1, f"is too large for a recipe; allowed: at most {MAX_BYTES} bytes; is it another kind of file?"
        )
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise _Unreadable(1, "is not UTF-8 text but UTF-16; save it as UTF-8")
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise _Unreadable(
            line, f"is not UTF-8 text (byte 0x{data[error.start]:02x} there); save it as UTF-8"
        ) from None


_HINTS = (
    ("'\\t'", "a tab stands where only spaces are allowed; replace tabs by spaces"),
    ("mapping values are not allowed", 'a text that holds ": " needs quotes around it'),
    ("sequence entries are not allowed", 'a lone - needs quotes around it ("-")'),
    ("could not find expected ':'", "this line, or the one before, lacks `key: `"),
    ("special characters are not allowed", "a control character stands there; delete it"),
)


def _yaml_problem(error: yaml.YAMLError, text: str) -> _Unreadable:
    line = 1
    reason = str(error)
    if isinstance(error, yaml.MarkedYAMLError):
        mark = error.problem_mark or error.context_mark
        line = mark.line + 1 if mark else 1
        reason = error.problem or error.context or "cannot be parsed"
    elif isinstance(error, yaml.reader.ReaderError):
        line = text.count("\n", 0, error.position) + 1
        reason = error.reason
    for mark_text, advice in _HINTS:
        if mark_text in reason:
            return _Unreadable(line, f"is not valid YAML: {advice}")
    return _Unreadable(line, f"is not valid YAML: {reason}")


def _parsed(text: str, problems: Problems) -> Node:
    try:
        builder = _Builder(text, problems)
    except yaml.YAMLError as error:  # a character that YAML does not allow is found at once
        raise _yaml_problem(error, text) from None
    return builder.document()


class _Builder:
    """Turns the events of one YAML text into the tree."""

    def __init__(self, text: str, problems: Problems) -> None:
        self.text = text
        self.problems = problems
        self.parser: Any = yaml.SafeLoader(text)

    def next(self) -> yaml.Event:
        try:
            event: yaml.Event = self.parser.get_event()
        except yaml.YAMLError as error:
            raise _yaml_problem(error, self.text) from None
        except (ValueError, OverflowError):  # PyYAML lets them through for "\U00110000"
            line = self.parser.line + 1
            raise _Unreadable(line, "is not valid YAML: there is no character with this number") from None
        return event

    def document(self) -> Node:
        self.next()  # start of the stream
        event = self.next()
        if isinstance(event, yaml.StreamEndEvent):
            raise _Unreadable(1, "is empty; a recipe needs at least `radical` and `structure`")
        node = self.node(self.next(), 1)
        self.next()  # end of the document
        event = self.next()
        if not isinstance(event, yaml.StreamEndEvent):
            self.problems.add(
                _line(event),
                "",
                "a second document starts here; allowed: one recipe per file",
            )
        return node

    def node(self, event: yaml.Event, depth: int) -> Node:
        line = _line(event)
        if depth > MAX_DEPTH:
            raise _Unreadable(line, f"is nested too deeply; allowed: at most {MAX_DEPTH} levels")
        if isinstance(event, yaml.AliasEvent):
            self.problems.add(line, "", f"an alias (*{event.anchor}) stands here; write the value out")
            return Scalar(line, "", None)
        if (anchor := getattr(event, "anchor", None)) is not None:
            self.problems.add(line, "", f"an anchor (&{anchor}) stands here; write the value out")
        if (tag := getattr(event, "tag", None)) is not None:
            self.problems.add(line, "", f"a tag ({tag}) stands here; allowed: plain values")
        if isinstance(event, yaml.SequenceStartEvent):
            return self.sequence(line, depth)
        if isinstance(event, yaml.MappingStartEvent):
            return self.mapping(line, depth)
        assert isinstance(event, yaml.ScalarEvent)
        text = event.value
        if _UNUSABLE.search(text):
            raise _Unreadable(line, "a text holds a control character; delete it")
        return Scalar(line, text, _understood(text) if event.style is None else text)

    def sequence(self, line: int, depth: int) -> NodeList:
        items = []
        while not isinstance(event := self.next(), yaml.SequenceEndEvent):
            items.append(self.node(event, depth + 1))
        return NodeList(line, tuple(items))

    def mapping(self, line: int, depth: int) -> NodeMap:
        entries: dict[str, Entry] = {}
        while not isinstance(event := self.next(), yaml.MappingEndEvent):
            key = self.node(event, depth + 1)
            value = self.node(self.next(), depth + 1)
            if not isinstance(key, Scalar):
                self.problems.add(key.line, "", "a key is a list or a mapping; allowed: a word")
            elif key.text in entries:
                first = entries[key.text].line
                self.problems.add(
                    key.line, _short(key.text), f"stands twice (first on line {first}); keep one of them"
                )
            else:
                entries[key.text] = Entry(key.line, value)
        return NodeMap(line, entries)


def _line(event: yaml.Event) -> int:
    return event.start_mark.line + 1 if event.start_mark else 1


def _understood(text: str) -> str | int | float | bool | None:
    if text in ("", "null", "~"):
        return None
    if text in ("true", "false"):
        return text == "true"
    if _INTEGER.fullmatch(text):
        return int(text)
    if _NUMBER.fullmatch(text):
        return float(text)
    return text


def _short(text: str) -> str:
    flat = " ".join(text.split())
    return flat if len(flat) <= 60 else flat[:57] + "..."


def found(node: Node) -> str:
    """What a node holds, for the end of a sentence."""
    if isinstance(node, NodeList):
        return "a list"
    if isinstance(node, NodeMap):
        return "a mapping"
    if node.value is None:
        return "nothing"
    return f'"{_short(node.text)}"' if isinstance(node.value, str) else _short(node.text)
