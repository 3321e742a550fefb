"""Tables: plain, tidy, the same in every format, and quick over many results."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import pandas
import pytest
from samples import result

from unpaired import columns, tables
from unpaired.errors import ChoiceError, RecordError
from unpaired.result import load_result

ROWS = [{"a": 0.1, "b": True, "c": None, "d": "x,y"}, {"a": 1 / 3, "b": False, "c": 2, "d": 'say "x"'}]


def test_csv_writes_truth_and_emptiness_plainly() -> None:
    assert tables.as_csv(ROWS, "abcd") == (
        'a,b,c,d\n0.1,true,,"x,y"\n0.3333333333333333,false,2,"say ""x"""\n'
    )


def test_csv_floats_read_back_the_same() -> None:
    read = list(csv.DictReader(io.StringIO(tables.as_csv(ROWS, "abcd"))))
    assert [float(row["a"]) for row in read] == [0.1, 1 / 3]


def test_markdown_has_a_ruled_head_and_escapes_bars() -> None:
    assert tables.as_markdown([{"a": 0.5, "b": "x|y"}], "ab") == "| a | b |\n| --- | --- |\n| 0.5 | x\\|y |\n"


def test_json_says_null_for_unknown() -> None:
    assert json.loads(tables.as_json(ROWS, "ac")) == [{"a": 0.1, "c": None}, {"a": 1 / 3, "c": 2}]


def test_parquet_reads_back_with_pandas() -> None:
    read = pandas.read_parquet(io.BytesIO(tables.as_parquet(ROWS, "abcd")))
    assert read["a"].tolist() == [0.1, 1 / 3]
    assert read["b"].tolist() == [True, False]
    assert read["d"].tolist() == ["x,y", 'say "x"']


def test_parquet_keeps_an_empty_column() -> None:
    read = pandas.read_parquet(io.BytesIO(tables.as_parquet([{"a": None}], "a")))
    assert read["a"].isna().tolist() == [True]


def test_a_table_that_does_not_exist_names_those_that_do() -> None:
    with pytest.raises(ChoiceError, match='table "coupling" does not exist; did you mean "couplings"'):
        tables.collect([result()], "coupling")


def test_the_frame_has_the_registry_columns_in_order() -> None:
    frame = tables.couplings_table([result("one"), result("two")])
    assert tuple(frame.columns) == columns.names("couplings")
    assert frame["radical"].tolist() == ["one", "one", "two", "two"]


def test_a_written_result_reads_back_the_same(tmp_path: Path) -> None:
    folder = tables.write_result(result(), tmp_path)
    assert load_result(folder).to_dict() == json.loads(json.dumps(result().to_dict())) | {
        "tables": {
            name: [{key: row.get(key) for key in columns.names(name)} for row in rows]
            for name, rows in result().tables.items()
        }
    }


def test_a_written_folder_holds_what_the_contract_names(tmp_path: Path) -> None:
    folder = tables.write_result(result(), tmp_path)
    assert sorted(path.name for path in folder.iterdir()) == [
        "couplings.csv",
        "flags.csv",
        "record.json",
        "states.csv",
        "structure.xyz",
    ]


def test_a_folder_without_a_record_is_refused(tmp_path: Path) -> None:
    with pytest.raises(RecordError, match="give a folder that `unpaired run` left"):
        load_result(tmp_path)


def test_a_file_that_is_no_record_is_refused(tmp_path: Path) -> None:
    (tmp_path / "record.json").write_text('{"a": 1}')
    with pytest.raises(RecordError, match="is not a record of this program"):
        load_result(tmp_path)


def test_a_record_of_a_newer_program_is_refused(tmp_path: Path) -> None:
    folder = tables.write_result(result(), tmp_path)
    data = json.loads((folder / "record.json").read_text()) | {"schema_version": 99}
    (folder / "record.json").write_text(json.dumps(data))
    with pytest.raises(RecordError, match="schema version 99"):
        load_result(folder)
