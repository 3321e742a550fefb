"""Tidy tables from results, and the forms in which they are written."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Callable, Iterable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from . import columns
from .errors import ChoiceError, nearest
from .files import write_atomically
from .result import RECORD_FILE, Result, Row
from .structures.xyz import xyz_text

if TYPE_CHECKING:
    import pandas


def collect(results: Iterable[Result], table: str) -> list[Row]:
    """Rows of one table over many results. Raises ChoiceError for a table that does not exist."""
    if table not in columns.TABLES:
        raise ChoiceError(
            f'table "{table}" does not exist{nearest(table, columns.TABLES)} '
            f"(there are {', '.join(columns.TABLES)})"
        )
    return [row for result in results for row in result.rows(table)]


def table_frame(results: Iterable[Result], table: str) -> pandas.DataFrame:
    """One table over many results as a pandas DataFrame with the columns of the registry."""
    import pandas

    return pandas.DataFrame(collect(results, table), columns=list(columns.names(table)))


def couplings_table(results: Iterable[Result]) -> pandas.DataFrame:
    """One row per radical, level and nucleus; columns and units: `columns.TABLES["couplings"]`."""
    return table_frame(results, "couplings")


def states_table(results: Iterable[Result]) -> pandas.DataFrame:
    """One row per radical and level; columns and units: `columns.TABLES["states"]`."""
    return table_frame(results, "states")


def flags_table(results: Iterable[Result]) -> pandas.DataFrame:
    """One row per finding; columns: `columns.TABLES["flags"]`."""
    return table_frame(results, "flags")


def as_csv(rows: Sequence[Row], names: Sequence[str]) -> str:
    """Plain CSV: floats that read back the same, true/false, unknown is empty."""
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    writer.writerow(names)
    writer.writerows([_plain(row.get(name)) for name in names] for row in rows)
    return buffer.getvalue()


def as_markdown(rows: Sequence[Row], names: Sequence[str]) -> str:
    """A markdown table; numbers to six significant digits, for reading rather than computing."""

    def cell(value: object) -> str:
        if isinstance(value, float):
            return f"{value:.6g}" if abs(value) < 1e5 else f"{value:.6f}"
        return _plain(value).replace("|", "\\|").replace("\n", " ")

    lines = ["| " + " | ".join(names) + " |", "|" + " --- |" * len(names)]
    lines += ["| " + " | ".join(cell(row.get(name)) for name in names) + " |" for row in rows]
    return "\n".join(lines) + "\n"


def as_json(rows: Sequence[Row], names: Sequence[str]) -> str:
    """A JSON array with one object per row; unknown is null."""
    return (
        json.dumps([{name: row.get(name) for name in names} for row in rows], indent=1, allow_nan=False)
        + "\n"
    )


def as_parquet(rows: Sequence[Row], names: Sequence[str]) -> bytes:
    """An Apache Parquet file; a column without any value is written as text."""
    import pyarrow
    import pyarrow.parquet

    table = pyarrow.table({name: pyarrow.array([row.get(name) for row in rows]) for name in names})
    empty = [name for name in names if pyarrow.types.is_null(table.schema.field(name).type)]
    for name in empty:
        place = table.schema.get_field_index(name)
        table = table.set_column(place, name, table.column(name).cast(pyarrow.string()))
    sink = pyarrow.BufferOutputStream()
    pyarrow.parquet.write_table(table, sink)
    return bytes(sink.getvalue().to_pybytes())


FORMATS: dict[str, Callable[[Sequence[Row], Sequence[str]], str | bytes]] = {
    "csv": as_csv,
    "markdown": as_markdown,
    "json": as_json,
    "parquet": as_parquet,
}


def write_result(result: Result, out: Path) -> Path:
    """Write OUT/<radical>/: one CSV per table that has rows, structure.xyz, and record.json last.

    The three tables of the contract are written even when empty. Returns the folder.
    """
    folder = out / result.radical
    for table, rows in result.tables.items():
        if rows or table in ("couplings", "states", "flags"):
            write_atomically(folder / f"{table}.csv", as_csv(rows, columns.names(table)))
    write_atomically(folder / "structure.xyz", xyz_text(result.molecule, result.structure_note))
    write_atomically(folder / RECORD_FILE, json.dumps(result.to_dict(), indent=1, allow_nan=False) + "\n")
    return folder


def _plain(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "true" if value else "false"
    return repr(float(value)) if isinstance(value, float) else str(value)
