"""The record of one recipe: the question, the structure as computed, every table, and how it was made."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from . import columns
from .errors import ChoiceError, RecordError, nearest
from .molecule import Molecule

SCHEMA_VERSION = 1
RECORD_FILE = "record.json"

Row = Mapping[str, Any]


@dataclass(frozen=True, eq=False)
class Result:
    """Everything that a run found out about one radical."""

    radical: str
    recipe: Mapping[str, Any]
    """The recipe as understood, defaults filled in; `levels` is a list of Level.to_dict()."""
    molecule: Molecule
    """The structure as computed."""
    tables: Mapping[str, Sequence[Row]]
    """Rows per table name; the keys of a row are column names of the registry. Missing values are None."""
    details: Mapping[str, Any] = field(default_factory=dict)
    """Per level id: what has no place in a table (story of convergence, tensors' axes, weights)."""
    provenance: Mapping[str, Any] = field(default_factory=dict)
    """Versions of packages, editions of constants and isotopes, settings of the engine."""
    structure_note: str = ""
    """Where the structure comes from: the comment of structure.xyz."""
    schema_version: int = SCHEMA_VERSION

    @property
    def level_ids(self) -> tuple[str, ...]:
        """Ids of the recipe's levels, in recipe order."""
        return tuple(level["id"] for level in self.recipe["levels"])

    def level_id(self, wanted: str | None = None) -> str:
        """`wanted` if the result has it, the last level of the recipe for None.

        Raises ChoiceError naming the levels that there are.
        """
        ids = self.level_ids
        if wanted is None:
            return ids[-1]
        if wanted not in ids:
            raise ChoiceError(
                f'level "{wanted}" is not in the result of {self.radical}{nearest(wanted, ids)} '
                f"(levels there: {', '.join(ids)})"
            )
        return wanted

    def rows(self, table: str, level: str | None = None) -> list[Row]:
        """Rows of a table, all or those of one level id."""
        return [row for row in self.tables.get(table, ()) if level is None or row["level"] == level]

    @property
    def failed(self) -> bool:
        """True if at least one level gave no numbers."""
        return any(not row["converged"] for row in self.tables["states"])

    def to_dict(self) -> dict[str, Any]:
        """Plain data for JSON at full precision."""
        return {
            "schema_version": self.schema_version,
            "radical": self.radical,
            "recipe": dict(self.recipe),
            "molecule": self.molecule.to_dict(),
            "structure_note": self.structure_note,
            "tables": {name: [dict(row) for row in rows] for name, rows in self.tables.items()},
            "details": dict(self.details),
            "provenance": dict(self.provenance),
        }

    @classmethod
    def from_dict(cls, data: Mapping[str, Any]) -> Result:
        """The inverse of `to_dict`; columns that an older record lacks come back as None."""
        version = data["schema_version"]
        if version > SCHEMA_VERSION:
            raise RecordError(
                f"the record has schema version {version}, this program reads up to {SCHEMA_VERSION}: update it"
            )
        tables = {
            name: tuple(
                {key: row.get(key) for key in columns.names(name)} if name in columns.TABLES else dict(row)
                for row in rows
            )
            for name, rows in data["tables"].items()
        }
        return cls(
            radical=data["radical"],
            recipe=data["recipe"],
            molecule=Molecule(**{**data["molecule"], "elements": tuple(data["molecule"]["elements"])}),
            tables=tables,
            details=data["details"],
            provenance=data["provenance"],
            structure_note=data["structure_note"],
            schema_version=version,
        )


def load_result(path: str | Path) -> Result:
    """Read the folder that a run left (or its record.json).

    Raises RecordError with one sentence if there is none or it is not a record.
    """
    place = Path(path)
    record = place / RECORD_FILE if place.is_dir() else place
    try:
        data = json.loads(record.read_text(encoding="utf-8"))
    except OSError as error:
        raise RecordError(
            f"{record}: cannot be read ({error.strerror}); give a folder that `unpaired run` left"
        ) from None
    except ValueError as error:
        raise RecordError(
            f"{record}: is not a record of this program ({error}); run the recipe again"
        ) from None
    try:
        return Result.from_dict(data)
    except (KeyError, TypeError, AttributeError) as error:
        raise RecordError(
            f"{record}: is not a record of this program ({error!r}); run the recipe again"
        ) from None
