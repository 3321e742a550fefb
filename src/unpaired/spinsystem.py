"""A spin system: what a simulator needs to know of a radical, and the file that hands it over.

The file is JSON under the schema `data/spin-system.schema.json`, checked on writing and on reading: one
system, or a list of them. Couplings are signed, H/h = g mu_B B S_z / h + sum a S.I.
"""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import asdict, dataclass, field
from functools import cache
from importlib import resources
from pathlib import Path
from typing import Any

from .constants import MHZ_PER_MT
from .errors import ChoiceError, RecordError
from .nuclei import isotope

SCHEMA_VERSION = 1
SCHEMA_FILE = "data/spin-system.schema.json"
HAMILTONIAN = "h a S.I"

Tensor = tuple[tuple[float, float, float], tuple[float, float, float], tuple[float, float, float]]

CSV_COLUMNS = (
    "radical",
    "level",
    "isotopologue",
    "share",
    "coupling_kind",
    "electron_spin",
    "g_iso",
    "g_source",
    "group",
    "isotope",
    "nuclear_spin",
    "count",
    "a_iso_MHz",
    "a_iso_mT",
    "atoms",
)


@dataclass(frozen=True)
class SpinNucleus:
    """One nucleus of a group."""

    atom: str
    """Label in structure.xyz."""
    dipolar_MHz: Tensor | None = None
    """Traceless dipolar tensor in the axes of structure.xyz, None if the result has none."""


@dataclass(frozen=True)
class SpinGroup:
    """Equivalent nuclei of one isotope."""

    group: str
    """Label of its first atom."""
    isotope: str
    nuclear_spin: float
    """I of one nucleus."""
    count: int
    a_iso_MHz: float
    """Signed coupling of one nucleus."""
    a_iso_mT: float
    """The same in field units at g_e."""
    nuclei: tuple[SpinNucleus, ...]


@dataclass(frozen=True)
class SpinSystem:
    """One isotopologue of one radical at one level."""

    radical: str
    level: str
    electron_spin: float
    g_iso: float
    g_source: str
    """Where g comes from: it is never predicted here."""
    coupling_kind: str
    """`equilibrium` or `averaged`."""
    groups: tuple[SpinGroup, ...]
    isotopologue: str = "main"
    share: float = 1.0
    """Share of this isotopologue among the molecules; 1 if no mixture is considered."""
    peak_to_peak_width_mT: float | None = None
    provenance: Mapping[str, Any] = field(default_factory=dict)
    hamiltonian: str = HAMILTONIAN
    schema_version: int = SCHEMA_VERSION

    @property
    def name(self) -> str:
        """Radical and, if it is not the main one, isotopologue."""
        return self.radical if self.isotopologue == "main" else f"{self.radical} {self.isotopologue}"

    def to_dict(self) -> dict[str, Any]:
        """Plain data for JSON, in the order of the design."""
        first = ("schema_version", "radical", "level", "isotopologue", "share", "hamiltonian")
        everything = asdict(self)
        ordered = {key: everything[key] for key in first} | everything
        # Through JSON, so that tuples are lists here already and a round trip gives the same data.
        plain: dict[str, Any] = json.loads(json.dumps(ordered, allow_nan=False))
        return plain

    @classmethod
    def from_dict(cls, data: Mapping[str, Any]) -> SpinSystem:
        """The inverse of `to_dict`, for data that the schema has passed."""
        groups = tuple(
            SpinGroup(**{**group, "nuclei": tuple(_nucleus(nucleus) for nucleus in group["nuclei"])})
            for group in data["groups"]
        )
        return cls(**{**data, "groups": groups})


def _nucleus(data: Mapping[str, Any]) -> SpinNucleus:
    tensor = data["dipolar_MHz"]
    return SpinNucleus(data["atom"], None if tensor is None else tuple(tuple(row) for row in tensor))  # type: ignore[arg-type]


@cache
def schema() -> dict[str, Any]:
    """The JSON Schema of the file."""
    text = resources.files("unpaired").joinpath(SCHEMA_FILE).read_text(encoding="utf-8")
    loaded: dict[str, Any] = json.loads(text)
    return loaded


def systems_text(systems: Sequence[SpinSystem]) -> str:
    """JSON text: one object for one system, a list for several. Raises RecordError against the schema."""
    plain = [system.to_dict() for system in systems]
    content: Any = plain[0] if len(plain) == 1 else plain
    check(content, "the spin system to be written")
    return json.dumps(content, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def read_systems(path: str | Path) -> tuple[SpinSystem, ...]:
    """The systems of a file. Raises RecordError with the file and the place in it that is wrong."""
    place = Path(path)
    try:
        content = json.loads(place.read_text(encoding="utf-8"), parse_constant=_refuse_constant)
    except OSError as error:
        raise RecordError(f"{place}: cannot be read ({error.strerror})") from None
    except json.JSONDecodeError as error:
        raise RecordError(f"{place}:{error.lineno}: is not JSON ({error.msg})") from None
    except ValueError as error:
        raise RecordError(f"{place}: is not a spin-system file ({error})") from None
    check(content, str(place))
    entries = content if isinstance(content, list) else [content]
    return tuple(SpinSystem.from_dict(entry) for entry in entries)


def _refuse_constant(name: str) -> None:
    raise ValueError(f"{name} is not a number that JSON knows")


def check(content: Any, where: str) -> None:
    """Hold data against the schema and against itself. Raises RecordError naming the place that fails."""
    from jsonschema import Draft202012Validator
    from jsonschema.exceptions import best_match

    if not isinstance(content, dict | list) or content == []:
        raise RecordError(f"{where}: holds neither a spin system nor a list of them")
    one = Draft202012Validator({"$ref": "#/$defs/system", "$defs": schema()["$defs"]})
    entries = list(enumerate(content)) if isinstance(content, list) else [(None, content)]
    for number, entry in entries:
        prefix = [] if number is None else [number]
        problem = best_match(one.iter_errors(entry))
        if problem is not None:
            raise RecordError(f"{where}: {_address([*prefix, *problem.absolute_path])}: {problem.message}")
        for address, message in _contradictions(entry):
            raise RecordError(f"{where}: {_address([*prefix, *address])}: {message}")


def _contradictions(entry: Mapping[str, Any]) -> Iterable[tuple[list[str | int], str]]:
    """What the schema cannot say: keys that must fit each other."""
    seen: set[str] = set()
    for number, group in enumerate(entry["groups"]):
        here: list[str | int] = ["groups", number]
        try:
            spin = isotope(group["isotope"]).spin
        except ChoiceError as error:
            yield [*here, "isotope"], error.message
            continue
        if group["nuclear_spin"] != spin:
            yield [*here, "nuclear_spin"], f"is {group['nuclear_spin']}, but {group['isotope']} has {spin}"
        if group["count"] != len(group["nuclei"]):
            yield [*here, "count"], f"is {group['count']}, but nuclei holds {len(group['nuclei'])}"
        if not math.isclose(group["a_iso_mT"] * MHZ_PER_MT, group["a_iso_MHz"], rel_tol=1e-6, abs_tol=1e-9):
            yield (
                [*here, "a_iso_mT"],
                f"is {group['a_iso_mT']}, but a_iso_MHz is {group['a_iso_MHz']} ({MHZ_PER_MT:.5f} MHz/mT)",
            )
        for place, nucleus in enumerate(group["nuclei"]):
            if nucleus["atom"] in seen:
                yield [*here, "nuclei", place, "atom"], f"{nucleus['atom']} occurs twice"
            seen.add(nucleus["atom"])


def _address(path: Sequence[str | int]) -> str:
    """`[1].groups[0].count`, or `top level`."""
    text = "".join(f"[{part}]" if isinstance(part, int) else f".{part}" for part in path)
    return text.removeprefix(".") or "top level"


def systems_csv(systems: Sequence[SpinSystem]) -> str:
    """One row per group of every system; tensors have no place here."""
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    writer.writerow(CSV_COLUMNS)
    for system in systems:
        head = [getattr(system, name) for name in CSV_COLUMNS[:8]]
        for group in system.groups:
            values = [getattr(group, name) for name in CSV_COLUMNS[8:-1]]
            writer.writerow([*head, *values, " ".join(nucleus.atom for nucleus in group.nuclei)])
    return buffer.getvalue()
