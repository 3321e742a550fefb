"""`unpaired spectrum` and `unpaired export` as a user meets them."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable
from pathlib import Path

import pytest
from jsonschema import Draft202012Validator
from spin_samples import record

from unpaired.cli import main
from unpaired.result import RECORD_FILE, Result
from unpaired.spinsystem import schema

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def unpaired(capsys: pytest.CaptureFixture[str]) -> Run:
    """Run a command: exit status, standard output, standard error."""

    def run(*arguments: str | Path) -> tuple[int, str, str]:
        with pytest.raises(SystemExit) as left:
            main([str(argument) for argument in arguments])
        code = left.value.code
        seen = capsys.readouterr()
        return (0 if code is None else int(code)), seen.out, seen.err

    return run


def saved(folder: Path, result: Result) -> Path:
    folder.mkdir()
    (folder / RECORD_FILE).write_text(json.dumps(result.to_dict()), encoding="utf-8")
    return folder


@pytest.fixture
def methyl(tmp_path: Path) -> Path:
    return saved(tmp_path / "methyl", record([("13C", 1, 3.8), ("1H", 3, -2.304)], radical="methyl"))


def rows(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(text.splitlines()))


def test_the_line_list_goes_to_standard_output(unpaired: Run, methyl: Path) -> None:
    status, out, err = unpaired("spectrum", methyl)
    lines = rows(out)
    assert status == 0
    assert list(lines[0]) == ["field_mT", "intensity", "m_I_H2"]
    inner = [float(line["field_mT"]) for line in lines if line["m_I_H2"] == "0.5"]
    assert inner[1] - inner[0] == pytest.approx(0.0235, abs=5e-5)  # physics notes section 2
    assert sum(float(line["intensity"]) for line in lines) == pytest.approx(1.0)
    assert "level UKS-B3LYP/pcH-1, equilibrium couplings" in err
    assert "g = 2.002319 (free electron" in err
    assert "exact line positions by diagonalisation: a*a/(2 B0) = 0.0078 mT" in err
    assert "6 lines (4 combinations of m_I) from 335." in err


def test_lines_need_no_curve(unpaired: Run, tmp_path: Path) -> None:
    atom = saved(tmp_path / "atom", record([("1H", 1, 50.0)]))
    status, out, _ = unpaired("spectrum", atom, "--peak-to-peak-width-mT", "0.00001")
    assert status == 0
    assert len(rows(out)) == 2


def test_lines_curve_and_plots_are_written(unpaired: Run, methyl: Path, tmp_path: Path) -> None:
    wanted = [tmp_path / f"curve{ending}" for ending in (".csv", ".svg", ".png")]
    outputs = [word for path in wanted for word in ("--output", path)]
    status, out, err = unpaired("spectrum", methyl, "--lines", tmp_path / "lines.csv", *outputs)
    assert (status, err) == (0, "")
    assert "curve of 2001 points" in out
    assert len(rows((tmp_path / "lines.csv").read_text())) == 6
    curve = rows(wanted[0].read_text())
    assert list(curve[0]) == ["field_mT", "signal"]
    svg = wanted[1].read_text()
    assert "g = 2.00232: free electron" in svg
    assert "3 × 1H" in svg
    assert wanted[2].read_bytes().startswith(b"\x89PNG")


def test_a_measured_spectrum_is_laid_under(unpaired: Run, methyl: Path, tmp_path: Path) -> None:
    unpaired("spectrum", methyl, "--output", tmp_path / "own.csv")
    moved = [
        f"{float(row['field_mT']) * 10 + 5};{float(row['signal']) * 3}".replace(".", ",")
        for row in rows((tmp_path / "own.csv").read_text())
    ]
    measured = tmp_path / "recorder.txt"
    measured.write_text("Feld [G];Signal\n" + "\n".join(moved))
    status, out, _ = unpaired(
        "spectrum",
        methyl,
        "--measured",
        measured,
        "--output",
        tmp_path / "both.csv",
        "--output",
        tmp_path / "both.svg",
    )
    assert status == 0
    assert "2001 points (heading lines: 1), first column in G by its heading" in out
    assert "shift +0.5000 mT, scale 3, residual 0.00 % of the measured signal" in out
    assert "correlation 1.00000" in out
    assert list(rows((tmp_path / "both.csv").read_text())[0]) == ["field_mT", "signal", "measured"]
    assert "calculated" in (tmp_path / "both.svg").read_text()


def test_a_measured_field_in_the_wrong_unit_is_remarked_on(
    unpaired: Run, methyl: Path, tmp_path: Path
) -> None:
    unpaired("spectrum", methyl, "--output", tmp_path / "own.csv")
    gauss = [
        f"{float(row['field_mT']) * 10} {row['signal']}" for row in rows((tmp_path / "own.csv").read_text())
    ]
    (tmp_path / "recorder.txt").write_text("\n".join(gauss))
    _, _, err = unpaired("spectrum", methyl, "--measured", tmp_path / "recorder.txt")
    assert "first column taken as mT (no heading says)" in err
    assert "is large: check the unit of the first column" in err


def test_several_results_share_the_intensity(unpaired: Run, methyl: Path, tmp_path: Path) -> None:
    other = saved(tmp_path / "other", record([("14N", 1, 1.0)], radical="other"))
    status, out, err = unpaired("spectrum", methyl, other, "--weight", "1", "--weight", "3")
    lines = rows(out)
    assert status == 0
    assert list(lines[0]) == ["field_mT", "intensity", "m_I_H2", "m_I_N1", "radical", "isotopologue"]
    share = sum(float(line["intensity"]) for line in lines if line["radical"] == "other")
    assert share == pytest.approx(0.75)
    assert "other: weight 0.75" in err


def test_satellites_and_labels(unpaired: Run, methyl: Path) -> None:
    _, out, err = unpaired("spectrum", methyl, "--satellites", "0.005")
    assert {line["isotopologue"] for line in rows(out)} == {"main", "13C(C1)"}
    assert "2 isotopologues with 99.9" in err
    _, out, err = unpaired("spectrum", methyl, "--isotope", "H=2H")
    assert len({line["m_I_H2"] for line in rows(out)}) == 7
    assert "methyl: isotopologue 2H(H2+H3+H4)" in err


def test_a_fixed_field_sweeps_the_frequency(unpaired: Run, methyl: Path) -> None:
    _, out, _ = unpaired("spectrum", methyl, "--field-mT", "339")
    lines = rows(out)
    assert list(lines[0]) == ["frequency_MHz", "intensity", "m_I_H2"]
    assert len(lines) == 6


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (["--level", "UHF/pch1"], "levels there: UHF/pcH-1, UKS-B3LYP/pcH-1"),
        (["--peak-to-peak-width-mT", "0"], "width must be positive"),
        (["--peak-to-peak-width-mT", "-0.1"], "width must be positive"),
        (["--range", "100", "120"], "no line lies between 100 and 120 mT; the lines lie from 335."),
        (["--range", "350", "330"], "the range must rise"),
        (["--frequency-GHz", "0"], "--frequency-GHz: must be positive"),
        (["--frequency-GHz", "9", "--field-mT", "300"], "exclude each other"),
        (["--g", "-2"], "g must be positive"),
        (["--shape", "gausian"], '--shape: "gausian" does not exist; did you mean "gaussian"'),
        (["--lorentzian-share", "0.5"], "belongs to --shape mixture"),
        (["--signal", "absorbtion"], 'did you mean "absorption"'),
        (["--signal", "absorption", "--modulation-mT", "0.1"], "modulation belongs to a derivative"),
        (["--width-terms", "H2"], "not of the form GROUP=B,C"),
        (["--width-terms", "H2=-1,0"], "must be positive for every line"),
        (["--order", "third"], "there are auto, exact, second, first"),
        (["--isotope", "C1"], "not of the form ATOM=ISOTOPE"),
        (["--satellites", "2"], "between 0 and 1"),
        (["--coupling", "mean"], "there are averaged, equilibrium"),
        (["--weight", "1", "--weight", "2"], "2 given for 1 results"),
        (["--weight", "0"], "--weight: must be positive"),
        (["--noise", "-1"], "noise cannot be negative"),
        (["--noise", "0.1", "--seed", "-1"], "seed of the noise cannot be negative"),
        (["--frequency-GHz", "0.05", "--order", "second"], "too large for second order here"),
        (["--points", "1"], "2 to 2000000 points, found 1"),
        (["--measured", "nowhere.txt"], "nowhere.txt: cannot be read"),
        (["--output", "curve.pdf"], "curve.pdf: the ending tells what to write; use .csv, .svg, .png"),
    ],
)
def test_bad_input_is_one_sentence_and_status_2(
    unpaired: Run, methyl: Path, options: list[str], words: str
) -> None:
    status, out, err = unpaired("spectrum", methyl, *options)
    assert (status, out) == (2, "")
    assert words in err
    assert err.count("\n") == 1


def test_a_triplet_is_refused(unpaired: Run, tmp_path: Path) -> None:
    oxygen = saved(tmp_path / "oxygen", record([("17O", 2, 1.0)], multiplicity=3))
    status, _, err = unpaired("spectrum", oxygen)
    assert status == 2
    assert "S = 1" in err


def test_export_to_a_pipe_is_json_alone(unpaired: Run, methyl: Path) -> None:
    status, out, err = unpaired("export", methyl)
    data = json.loads(out)
    Draft202012Validator(schema()).validate(data)
    assert status == 0
    assert data["groups"][0]["a_iso_mT"] == -2.304
    assert "level UKS-B3LYP/pcH-1" in err


def test_export_of_several_results_is_a_list(unpaired: Run, methyl: Path, tmp_path: Path) -> None:
    other = saved(tmp_path / "other", record([("14N", 1, 1.0)], radical="other"))
    output, flat = tmp_path / "both.json", tmp_path / "both.csv"
    status, out, _ = unpaired("export", methyl, other, "--output", output, "--flat", flat, "--g", "2.01")
    data = json.loads(output.read_text())
    assert status == 0
    assert [entry["radical"] for entry in data] == ["methyl", "other"]
    assert {entry["g_source"] for entry in data} == {"given with the command"}
    assert [row["group"] for row in rows(flat.read_text())] == ["H2", "N1"]
    assert "2 spin systems written to" in out


def test_export_hands_over_a_triplet(unpaired: Run, tmp_path: Path) -> None:
    oxygen = saved(tmp_path / "oxygen", record([("17O", 2, 1.0)], multiplicity=3))
    _, out, _ = unpaired("export", oxygen, "--isotope", "O=17O")
    assert json.loads(out)["electron_spin"] == 1.0


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (["--output", "system.txt"], "let its name end in .json"),
        (["--flat", "system.txt"], "let its name end in .csv"),
        (["--level", "x"], "levels there"),
        (["--peak-to-peak-width-mT", "0"], "width must be positive"),
    ],
)
def test_export_refuses_in_one_sentence(unpaired: Run, methyl: Path, options: list[str], words: str) -> None:
    status, out, err = unpaired("export", methyl, *options)
    assert (status, out) == (2, "")
    assert words in err
    assert err.count("\n") == 1


@pytest.mark.slow
def test_what_a_run_leaves_is_what_both_commands_take(unpaired: Run, tmp_path: Path) -> None:
    (tmp_path / "hydrogen.xyz").write_text("1\n\nH 0 0 0\n")
    recipe = tmp_path / "hydrogen.yaml"
    recipe.write_text(
        "radical: hydrogen\nstructure: hydrogen.xyz\nlevels: [{scf: UHF, basis: pcH-1}]\n"
        'g: {value: 2.0022, source: "invented for a test"}\n'
    )
    status, _, _ = unpaired("run", recipe, "--out", tmp_path / "results")
    assert status == 0
    _, out, err = unpaired("spectrum", tmp_path / "results" / "hydrogen")
    low, high = (float(line["field_mT"]) for line in rows(out))
    # The exact atom splits by 50.97 mT at this frequency (physics notes section 2), pcH-1 is 1.7 % low (section 3).
    assert high - low == pytest.approx(50.97 * 0.983, rel=0.003)
    assert "g = 2.002200 (measured, from the recipe: invented for a test)" in err
    _, out, _ = unpaired("export", tmp_path / "results" / "hydrogen")
    data = json.loads(out)
    Draft202012Validator(schema()).validate(data)
    assert data["provenance"]["packages"]["pyscf"]
    assert data["groups"][0]["nuclei"][0]["dipolar_MHz"] == [pytest.approx([0, 0, 0], abs=1e-6)] * 3
