"""Records of every released schema version load for ever: one folder per version, never written again."""

from __future__ import annotations

from pathlib import Path

import pytest

from unpaired import columns, tables
from unpaired.report import full_report
from unpaired.result import SCHEMA_VERSION, load_result

RECORDS = Path(__file__).parent / "records"


def test_the_present_schema_has_a_record() -> None:
    assert (RECORDS / f"schema-{SCHEMA_VERSION}.json").is_file()


@pytest.mark.parametrize("path", sorted(RECORDS.glob("*.json")), ids=lambda path: path.stem)
def test_an_old_record_loads_prints_and_goes_into_every_table(path: Path) -> None:
    result = load_result(path)
    assert "+1.0" in full_report(result)  # 14N of NH2, about +1.01 mT
    for table in columns.TABLES:
        for row in tables.collect([result], table):
            assert tuple(row) == columns.names(table)
