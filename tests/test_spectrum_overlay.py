"""Reading measured spectra as instruments leave them, and laying calculated ones over them."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from spin_samples import system

from unpaired.errors import InputError
from unpaired.spectrum.curve import Curve, Width, draw, with_noise
from unpaired.spectrum.lines import line_list
from unpaired.spectrum.measured_curve import MeasuredCurve, read_measured_curve
from unpaired.spectrum.overlay import overlay, overlay_csv
from unpaired.spectrum.shapes import Shape

FIELDS = [330.5 + k for k in range(10)]
SIGNALS = [0.25, -1.5, 3.0, 0.0, 1e-3, -2.0, 4.0, 5.0, -6.25, 7.0]


def text(form: str, decimal: str = ".", heading: str = "") -> str:
    rows = [form.format(x, y) for x, y in zip(FIELDS, SIGNALS, strict=True)]
    return heading + "\n".join(rows).replace(".", decimal) + "\n"


def read(tmp_path: Path, content: str | bytes) -> MeasuredCurve:
    path = tmp_path / "measured.txt"
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return read_measured_curve(path)


@pytest.mark.parametrize(
    "content",
    [
        text("{} {}"),
        text("{}\t{}", ","),
        text("{};{}", ","),
        text("  {}   {}  "),
        text("{},{}"),
        text("{}, {}"),
        text("{};{};"),
        text('"{}","{}"'),
        text("{:.4e} {:.4E}"),
        text("{},{}", heading="field_mT,signal\n"),
        text("{};{}", ",", heading="Magnetfeld [mT];Signal\n\n"),
        text("{} {}", heading="# made by hand\n% twice\nField / mT   Intensity\n"),
        text("{} {}").replace("\n", "\r\n"),
        text("{} {}").replace("\n", "\n\n"),
        text("{} {}").replace("-", "\N{MINUS SIGN}"),
        "\ufeff" + text("{} {}"),
        text("{}\t{}").encode("utf-16"),
        ("Feldst\u00e4rke Signal\n" + text("{} {}")).encode("latin-1"),
    ],
    ids=range(18),
)
def test_separators_commas_and_headings_are_understood(tmp_path: Path, content: str | bytes) -> None:
    found = read(tmp_path, content)
    assert found.axis == "field_mT"
    assert found.position == pytest.approx(FIELDS)
    assert found.signal == pytest.approx(SIGNALS)


@pytest.mark.parametrize(
    "heading", ["2026-12-01 10:30\n", "1024\n", "sample 3; run 2\n10\n", "9.5-GHz run\n"]
)
def test_headings_may_begin_with_a_number(tmp_path: Path, heading: str) -> None:
    found = read(tmp_path, heading + text("{};{}"))
    assert found.position == pytest.approx(FIELDS)
    assert found.heading_lines == heading.count("\n")


def test_a_downward_sweep_is_turned_round(tmp_path: Path) -> None:
    upward = text("{} {}")
    found = read(tmp_path, "\n".join(reversed(upward.splitlines())))
    assert found.position == pytest.approx(FIELDS)
    assert found.signal == pytest.approx(SIGNALS)


def test_repeated_positions_are_averaged(tmp_path: Path) -> None:
    found = read(tmp_path, text("{} {}") + "339.5 9.0\n")
    assert len(found.position) == 10
    assert found.signal[-1] == pytest.approx(8.0)


@pytest.mark.parametrize(
    ("heading", "axis", "factor"),
    [
        ("Field [G];Signal", "field_mT", 0.1),
        ("field_G;signal", "field_mT", 0.1),
        ("B / T;signal", "field_mT", 1000.0),
        ("G;a.u.", "field_mT", 0.1),
        ("Gauss;a.u.", "field_mT", 0.1),
        ("frequency_MHz;signal", "frequency_MHz", 1.0),
        ("Frequency (GHz);signal", "frequency_MHz", 1000.0),
        ("# T = 298 K; g = 2.003", "field_mT", 1.0),
        ("# recorded at 9.5 GHz\nfield;signal", "field_mT", 1.0),
        ("Sample G;signal", "field_mT", 1.0),
    ],
)
def test_a_unit_in_the_heading_is_obeyed(tmp_path: Path, heading: str, axis: str, factor: float) -> None:
    found = read(tmp_path, heading + "\n" + text("{};{}"))
    assert found.axis == axis
    assert found.position == pytest.approx(np.array(FIELDS) * factor)


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (text("{} {}") + "340.5 abc\n", r'measured.txt:11: "abc" is not a number'),
        (text("{} {}") + "340.5\n", r"measured.txt:11: two numbers are expected, found 1"),
        (text("{} {}") + "340.5 1 2\n", r"measured.txt:11: two numbers are expected, found 3"),
        (text("{} {}") + "340.5 nan\n", r'measured.txt:11: "nan" is not a number'),
        (text("{} {}") + "340.5 1e999\n", r'measured.txt:11: "1e999" is not a number'),
        (
            text("{},{}", ","),
            r"measured.txt:1: two numbers .* found 4 between commas; with decimal commas, separate",
        ),
        ("1 2\n3 4\n", r"measured.txt: holds 2 lines of two numbers; a spectrum needs at least 8"),
        ("", r"measured.txt: holds 0 lines"),
        ("330.5 abc\n" + text("{} {}"), r'measured.txt:1: "abc" is not a number'),
        ("\n".join(["330 1"] * 5 + ["330 2"] * 5), r"first column hardly changes"),
        ("\n".join(f"{k} 1" for k in range(10)), r"second column is constant"),
    ],
)
def test_what_cannot_be_read_says_where(tmp_path: Path, content: str, words: str) -> None:
    with pytest.raises(InputError, match=words):
        read(tmp_path, content)


def test_a_missing_file_is_named() -> None:
    with pytest.raises(InputError, match=r"nowhere.txt: cannot be read"):
        read_measured_curve("nowhere.txt")


def calculated() -> Curve:
    one = system(("1H", 3, -2.3), ("14N", 1, 0.6))
    lines = line_list([(one, 1.0)], frequency_MHz=9500.0, width_mT=0.1)
    return draw(lines, Width(0.1), Shape(0.1), 1.0)


def as_measured(curve: Curve, shift: float, scale: float, noise: float = 0.0) -> MeasuredCurve:
    """The curve on another grid, moved and scaled, as if an instrument had drawn it."""
    noisy = with_noise(curve, noise, seed=3) if noise else curve
    grid = np.linspace(curve.position[0] + shift - 2, curve.position[-1] + shift + 3, 3001)
    signal = np.interp(grid - shift, noisy.position, scale * noisy.signal, left=0, right=0)
    return MeasuredCurve(curve.axis, grid, signal, 0, "")


@pytest.mark.parametrize("shift", [0.0, 1.234, -7.5, 40.0])
@pytest.mark.parametrize("scale", [1.0, 350.0, 1e-4])
def test_shift_and_scale_are_found(shift: float, scale: float) -> None:
    curve = calculated()
    fit = overlay(curve, as_measured(curve, shift, scale))
    assert fit.shift == pytest.approx(shift, abs=1e-3)
    assert fit.scale == pytest.approx(scale, rel=1e-3)
    assert fit.residual < 0.01
    assert fit.correlation > 0.9999


def test_residual_and_correlation_are_those_of_the_noise() -> None:
    curve = calculated()
    measured = as_measured(curve, 0.5, 2.0, noise=0.05)
    fit = overlay(curve, measured)
    left = measured.signal - fit.calculated
    assert fit.shift == pytest.approx(0.5, abs=0.01)
    assert fit.residual == pytest.approx(np.sqrt(np.mean(left**2) / np.mean(measured.signal**2)))
    assert fit.correlation == pytest.approx(np.sqrt(1 - fit.residual**2), abs=1e-3)


def test_the_scale_is_that_of_least_squares() -> None:
    curve = calculated()
    measured = as_measured(curve, 0.5, 2.0, noise=0.05)
    fit = overlay(curve, measured)
    model = fit.calculated / fit.scale
    (expected,), *_ = np.linalg.lstsq(model[:, None], measured.signal, rcond=None)
    assert fit.scale == pytest.approx(expected, rel=1e-9)


def test_columns_of_the_overlay() -> None:
    curve = calculated()
    assert overlay_csv(overlay(curve, as_measured(curve, 0.0, 1.0))).startswith("field_mT,signal,measured\n")


def test_axes_must_agree() -> None:
    curve = calculated()
    measured = as_measured(curve, 0.0, 1.0)
    with pytest.raises(
        InputError, match="measured spectrum is over frequency_MHz, the calculated one over field_mT"
    ):
        overlay(curve, MeasuredCurve("frequency_MHz", measured.position, measured.signal, 0, ""))
