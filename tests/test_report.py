"""The printed view: levels side by side, findings beside the numbers, nothing cut."""

from __future__ import annotations

import dataclasses

from samples import result

from unpaired.report import coupling_report, flag_report, full_report, state_report
from unpaired.result import Result


def with_row(table: str, place: int, **values: object) -> Result:
    whole = result()
    rows = [dict(row) for row in whole.tables[table]]
    rows[place] |= values
    return dataclasses.replace(whole, tables={**whole.tables, table: rows})


def flagged(**values: object) -> Result:
    row = {"radical": "sample", "level": "UHF/pcH-1", "atom": None, "code": "made-up", "severity": "bad"}
    row |= {"value": 0.2, "limit": 0.1, "advice": "do something"} | values
    return dataclasses.replace(result(), tables={**result().tables, "flags": [row]})


def test_levels_stand_side_by_side_with_signs_and_both_units() -> None:
    head, line = coupling_report(result()).splitlines()
    assert head.split() == ["group", "nuclei", "isotope", "UHF/pcH-1", "ROHF/pcH-1"]
    assert line.split() == ["H1", "1", "1H", "+47.830", "(+1340.4)", "+47.830", "(+1340.4)"]


def test_a_bad_finding_marks_the_numbers_of_its_level_only() -> None:
    line = coupling_report(flagged()).splitlines()[1]
    assert line.split() == ["H1", "1", "1H", "+47.830", "(+1340.4)", "!!", "+47.830", "(+1340.4)"]


def test_a_finding_about_another_atom_marks_nothing() -> None:
    assert "!!" not in coupling_report(flagged(atom="H2"))


def test_a_finding_is_printed_with_value_limit_and_advice() -> None:
    assert flag_report(flagged()) == ("!! made-up (bad): UHF/pcH-1 0.2 (limit 0.1)\n     do something\n")


def test_a_failed_level_says_failed() -> None:
    failed = with_row("states", 1, converged=False, energy_Eh=None, flags="not-converged")
    assert state_report(failed).splitlines()[2].split() == ["ROHF/pcH-1", "failed", "not-converged"]


def test_an_average_over_conformers_is_shown_and_said() -> None:
    averaged = with_row("couplings", 0, a_averaged_mT=40.0)
    averaged = dataclasses.replace(
        averaged, recipe={**averaged.recipe, "temperature_K": 298.0, "temperature_assumed": True}
    )
    text = full_report(averaged)
    assert "+40.000 (+1121.0)" in text
    assert "conformers.csv at 298 K (assumed, the recipe names none)" in text
