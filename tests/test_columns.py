"""The registry of columns keeps the contract's names and order."""

from __future__ import annotations

import pytest

from unpaired import columns

CONTRACT = {
    "couplings": (
        "radical level scf functional basis atom isotope group group_size spin_density_au a_iso_MHz a_iso_mT "
        "a_group_mT"
    ),
    "states": (
        "radical level scf functional basis basis_functions energy_Eh s_squared s_squared_exact contamination "
        "converged stable iterations wall_s"
    ),
    "flags": "radical level atom code severity value limit advice",
}


@pytest.mark.parametrize("table", CONTRACT)
def test_the_first_columns_are_those_of_the_contract(table: str) -> None:
    wanted = tuple(CONTRACT[table].split())
    assert columns.names(table)[: len(wanted)] == wanted


@pytest.mark.parametrize("table", ["couplings", "states"])
def test_flags_come_last(table: str) -> None:
    assert columns.names(table)[-1] == "flags"


@pytest.mark.parametrize("table", columns.TABLES)
def test_no_column_stands_twice_and_each_has_a_meaning(table: str) -> None:
    names = columns.names(table)
    assert len(set(names)) == len(names)
    assert all(column.meaning for column in columns.TABLES[table])


@pytest.mark.parametrize("table", columns.TABLES)
def test_a_name_that_ends_in_a_unit_says_so_in_the_registry(table: str) -> None:
    units = {"_MHz": "MHz", "_mT": "mT", "_Eh": "Eh", "_s": "s", "_cm": "cm^-1", "_K": "K"}
    for column in columns.TABLES[table]:
        for ending, unit in units.items():
            if column.name.endswith(ending):
                assert column.unit == unit, column.name
