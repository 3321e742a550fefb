"""Levels side by side: values, brackets, words, files."""

from __future__ import annotations

import csv
import io
from dataclasses import replace

import pytest
from typer.testing import CliRunner

from unpaired.cli import app
from unpaired.contrast import COLUMNS, Known, bracket, contrast, contrast_report, tidy_rows
from unpaired.errors import InputError
from unpaired.figures.contrast import contrast_figure
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.result import Result
from unpaired.tables import as_csv, write_result

LEVELS = (
    Level("UHF", "pcH-1"),
    Level("ROHF", "pcH-1"),
    Level("UKS", "pcH-1", "B3LYP"),
    Level("ROKS", "pcH-1", "B3LYP"),
)
VALUES = {"UHF": -4.0, "ROHF": 0.0, "UKS": -2.0, "ROKS": 0.0}


def record(radical="sample", levels=LEVELS, measured=(), failed=()):
    """Made-up couplings of one group of two protons and one carbon."""
    couplings, states, polarisation = [], [], []
    for level in levels:
        names = {"radical": radical, "level": level.id, "scf": level.scf, "functional": level.functional}
        good = level.id not in failed
        states.append(names | {"converged": good, "flags": ""})
        for atom, isotope, group, size in (
            ("C1", "13C", "C1", 1),
            ("H2", "1H", "H2", 2),
            ("H3", "1H", "H2", 2),
        ):
            value = VALUES[level.scf] * (1 if isotope == "1H" else -1.5) if good else None
            shift = {"H2": 0.5, "H3": -0.5}.get(atom, 0.0)
            couplings.append(
                names
                | {"atom": atom, "isotope": isotope, "group": group, "group_size": size}
                | {
                    "a_group_mT": value,
                    "direct_mT": 0.25 + shift if good else None,
                    "polarisation_mT": value - 0.25 if good else None,
                    "a_group_projected_mT": value / 3 if good and level.scf == "UHF" else None,
                }
            )
        if level.is_unrestricted:
            for pair, kind, value in (
                ("C1", "core", 0.1),
                ("C1-H2", "valence", -1.9),
                ("C1-H3", "valence", 0.3),
                ("H2", "valence", -0.01),
            ):
                row = {"radical": radical, "level": level.id, "atom": "H2", "pair": pair, "kind": kind}
                polarisation.append(row | {"contribution_mT": value})
    return Result(
        radical=radical,
        recipe={
            "radical": radical,
            "levels": [level.to_dict() for level in levels],
            "measured": [
                {"atoms": atoms, "count": len(atoms), "coupling_mT": value, "sign": sign, "source": "made up"}
                for atoms, value, sign in measured
            ],
        },
        molecule=Molecule(("C", "H", "H"), [[0, 0, 0], [2, 0, 0], [0, 2, 0]], 1, 2),
        tables={"couplings": couplings, "states": states, "flags": [], "polarisation": polarisation},
    )


def group(found, label):
    return next(entry for entry in found if entry.group == label)


def test_treatments_stand_from_no_polarisation_to_all_of_it():
    found = group(contrast([record()], ["one"]), "H2")
    assert [value.treatment for value in found.values] == ["ROHF", "UHF projected", "UHF", "ROKS", "UKS"]
    assert [value.coupling_mT for value in found.values] == pytest.approx([0, -4 / 3, -4, 0, -2])
    assert found.nuclei == ("H2", "H3")


def test_direct_and_polarisation_are_means_over_the_group():
    found = group(contrast([record()], ["one"]), "H2")
    plain = next(value for value in found.values if value.treatment == "UHF")
    assert (plain.direct_mT, plain.polarisation_mT) == pytest.approx((0.25, -4.25))


@pytest.mark.parametrize(
    ("projected", "plain", "value", "signed", "within"),
    [
        (-1.5, -4.5, -2.3, True, True),
        (-1.5, -4.5, 2.3, True, False),
        (-1.5, -4.5, 2.3, False, True),
        (-1.5, -4.5, 1.4, False, False),
        (0.5, -1.0, 0.2, False, True),
        (0.5, -1.0, 0.8, False, True),
        (0.5, -1.0, 1.2, False, False),
    ],
)
def test_a_measured_value_is_bracketed_by_magnitude_where_its_sign_is_unknown(
    projected, plain, value, signed, within
):
    judged = bracket("UHF/pcH-1", projected, plain, Known(value, signed))
    assert judged.within is within
    assert ("unknown" in judged.rule) is not signed


def test_the_report_names_the_three_largest_pairs_the_rule_and_the_zero_by_construction():
    text = contrast_report(contrast([record(measured=[(["H2", "H3"], 2.3, "unknown")])], ["one"]))
    assert (
        "valence pair on C1-H2: -1.90 mT; valence pair on C1-H3: +0.30 mT; core pair on C1: +0.10 mT" in text
    )
    assert "|2.3|" in text
    assert "magnitudes, the sign is unknown" in text
    assert "polarisation is zero by construction" in text


def test_the_tidy_file_has_one_row_per_group_and_treatment_and_one_per_measured_value():
    rows = tidy_rows(contrast([record(measured=[(["H2", "H3"], -2.3, "-")])], ["one"]))
    table = list(csv.DictReader(io.StringIO(as_csv(rows, COLUMNS))))
    assert len(table) == 2 * 5 + 1
    (measured,) = (row for row in table if row["treatment"] == "measured")
    assert (measured["measured_within"], measured["rule"], measured["sign"]) == (
        "true",
        "signed values",
        "known",
    )


def test_a_failed_level_leaves_the_others():
    found = group(contrast([record(failed=("UHF/pcH-1",))], ["one"]), "H2")
    assert [value.treatment for value in found.values] == ["ROHF", "ROKS", "UKS"]


def test_a_level_that_two_results_have_is_told_apart_by_the_result():
    found = contrast([record(levels=LEVELS[:1]), record(levels=LEVELS[:2])], ["a", "b"])
    assert {value.level for value in found[0].values} == {"a UHF/pcH-1", "b UHF/pcH-1", "ROHF/pcH-1"}


def test_results_without_a_common_group_are_refused_in_one_sentence():
    other = record()
    rows = [row | {"group": "N9"} for row in other.tables["couplings"]]
    other = replace(other, tables={**other.tables, "couplings": rows})
    with pytest.raises(InputError, match=r"^a, b: have no group of equivalent nuclei in common"):
        contrast([record(), other], ["a", "b"])


def test_the_plot_has_a_row_per_group_and_names_every_level():
    svg = contrast_figure(contrast([record(measured=[(["H2"], 2.3, "unknown")])], ["one"]), "svg")
    assert svg.startswith(b"<?xml")
    assert contrast_figure(contrast([record()], ["one"]), "png").startswith(b"\x89PNG")


def test_the_command_prints_and_writes(tmp_path):
    folder = write_result(record(), tmp_path)
    printed = CliRunner().invoke(app, ["contrast", str(folder)])
    assert printed.exit_code == 0
    assert "UHF/pcH-1 projected" in printed.output
    for ending in ("csv", "svg", "png"):
        target = tmp_path / f"plot.{ending}"
        assert CliRunner().invoke(app, ["contrast", str(folder), "--output", str(target)]).exit_code == 0
        assert target.stat().st_size > 300
    refused = CliRunner().invoke(app, ["contrast", str(folder), "--output", str(tmp_path / "plot.gif")])
    assert refused.exit_code == 2
