"""unpaired spectrum: from the couplings of finished runs to lines, a curve and a plot."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from .choices import GFactor, LevelId, NamedIsotopes, Results, Satellites, WhichCoupling, isotope_labels

if TYPE_CHECKING:
    from ..result import Result
    from ..spectrum.curve import Curve
    from ..spectrum.isotopologues import Question
    from ..spectrum.lines import Lines
    from ..spectrum.measured_curve import MeasuredCurve
    from ..spectrum.overlay import Overlay
    from ..spectrum.splitting import Sweep
    from ..spinsystem import SpinSystem

SIGNALS = ("absorption", "first-derivative", "second-derivative")
SHAPES = ("gaussian", "lorentzian", "mixture")
ENDINGS = (".csv", ".svg", ".png")


def spectrum(
    results: Results,
    level: LevelId = None,
    frequency_GHz: Annotated[
        float | None, typer.Option("--frequency-GHz", help="Fixed frequency, the field is swept (9.5).")
    ] = None,
    field_mT: Annotated[
        float | None, typer.Option("--field-mT", help="Fixed field instead: the frequency is swept.")
    ] = None,
    g: GFactor = None,
    peak_to_peak_width_mT: Annotated[
        float, typer.Option("--peak-to-peak-width-mT", help="Width of the first derivative.")
    ] = 0.1,
    width_terms: Annotated[
        str | None,
        typer.Option(metavar="GROUP=B,C", help="Width + B m + C m^2 in mT, with m_I of this group."),
    ] = None,
    shape: Annotated[str, typer.Option(help="gaussian, lorentzian or mixture.")] = "gaussian",
    lorentzian_share: Annotated[
        float | None, typer.Option(help="Share of the Lorentzian in a mixture (0.5).")
    ] = None,
    signal: Annotated[
        str, typer.Option(help="absorption, first-derivative or second-derivative.")
    ] = "first-derivative",
    modulation_mT: Annotated[
        float, typer.Option("--modulation-mT", help="Peak-to-peak field modulation.")
    ] = 0.0,
    range_: Annotated[
        tuple[float, float] | None,
        typer.Option(
            "--range", metavar="LOW HIGH", help="In mT (MHz at fixed field); default: from the lines."
        ),
    ] = None,
    points: Annotated[int | None, typer.Option(help="Points of the curve; default: 20 per width.")] = None,
    noise: Annotated[float, typer.Option(help="Noise as a share of the largest signal.")] = 0.0,
    seed: Annotated[int, typer.Option(help="Seed of the noise.")] = 0,
    order: Annotated[str, typer.Option(help="Line positions: auto, exact, second or first.")] = "auto",
    isotope: NamedIsotopes = None,
    satellites: Satellites = None,
    coupling: WhichCoupling = "averaged",
    weight: Annotated[
        list[float] | None, typer.Option(help="Weight of a RESULT, in their order; may be repeated.")
    ] = None,
    measured: Annotated[
        Path | None, typer.Option(help="Two-column file of a measured spectrum to lay the curve over.")
    ] = None,
    lines: Annotated[Path | None, typer.Option(help="CSV file for the line list.")] = None,
    output: Annotated[
        list[Path] | None, typer.Option(help="Curve as .csv, plot as .svg or .png; may be repeated.")
    ] = None,
) -> None:
    """Lines and curve of the isotropic spectrum that the couplings give.

    Without --lines and --output the line list goes to standard output.
    """
    from ..errors import InputError, require_choice
    from ..files import write_atomically
    from ..result import load_result
    from ..spectrum.curve import Width, curve_csv, draw, with_noise
    from ..spectrum.isotopologues import Question
    from ..spectrum.lines import line_list, lines_csv
    from ..spectrum.measured_curve import read_measured_curve
    from ..spectrum.overlay import overlay, overlay_csv
    from ..spectrum.shapes import Shape

    require_choice("--shape", shape, SHAPES)
    require_choice("--signal", signal, SIGNALS)
    for path in output or []:
        if path.suffix.lower() not in ENDINGS:
            raise InputError(f"{path}: the ending tells what to write; use {', '.join(ENDINGS)}")
    frequency_MHz, field = _fixed(frequency_GHz, field_mT)
    width = Width(peak_to_peak_width_mT, *_width_terms(width_terms))
    question = Question(
        level,
        coupling,
        isotope_labels(isotope),
        satellites,
        g,
        peak_to_peak_width_mT,
    )
    found = [load_result(path) for path in results]
    parts, notes = _parts(found, question, weight or [])
    listed = line_list(
        parts,
        frequency_MHz=frequency_MHz,
        field_mT=field,
        width_mT=peak_to_peak_width_mT,
        order=order,
    )
    sweep = listed.sweep
    share = {"gaussian": 0.0, "lorentzian": 1.0, "mixture": 0.5}[shape]
    if lorentzian_share is not None:
        if shape != "mixture":
            raise InputError(f"--lorentzian-share belongs to --shape mixture, not to {shape}")
        share = lorentzian_share
    drawn_shape = Shape(
        peak_to_peak_width_mT * sweep.axis_per_mT,
        share,
        SIGNALS.index(signal),
        modulation_mT * sweep.axis_per_mT,
    )
    notes += _line_notes(listed)
    fit = None
    # The lines alone need no curve: they may be too far apart for any grid.
    if output or measured or range_ or points is not None or width_terms or noise or modulation_mT:
        curve = draw(listed, width, drawn_shape, sweep.axis_per_mT, range_ or (None, None), points)
        notes += _curve_notes(curve, noise, seed)
        if noise:
            curve = with_noise(curve, noise, seed)
        if measured is not None:
            read = read_measured_curve(measured)
            fit = overlay(curve, read)
            notes += _fit_notes(measured, read, fit)
        for path in output or []:
            plot = path.suffix.lower() != ".csv"
            if plot:
                write_atomically(path, _plot(path, listed, curve, sweep, peak_to_peak_width_mT, fit))
            else:
                write_atomically(path, overlay_csv(fit) if fit else curve_csv(curve))
            notes.append(f"{'plot' if plot else 'curve'} written to {path}")
    if lines is not None:
        write_atomically(lines, lines_csv(listed))
        notes.append(f"line list written to {lines}")
    to_screen = lines is None and not output
    print("\n".join(notes), file=sys.stderr if to_screen else sys.stdout)
    if to_screen:
        sys.stdout.write(lines_csv(listed))


def _fixed(frequency_GHz: float | None, field_mT: float | None) -> tuple[float | None, float | None]:
    """Frequency in MHz and field in mT, one of them None."""
    from ..errors import InputError

    if frequency_GHz is not None and field_mT is not None:
        raise InputError("--frequency-GHz and --field-mT exclude each other: one is fixed, the other swept")
    for option, value in (("--frequency-GHz", frequency_GHz), ("--field-mT", field_mT)):
        if value is not None and not 0 < value < float("inf"):
            raise InputError(f"{option}: must be positive, found {value:g}")
    if field_mT is not None:
        return None, field_mT
    return (9.5 if frequency_GHz is None else frequency_GHz) * 1000, None


def _width_terms(text: str | None) -> tuple[float, float, str | None]:
    from ..errors import InputError

    if text is None:
        return 0.0, 0.0, None
    group, _, numbers = text.partition("=")
    try:
        linear, square = (float(part) for part in numbers.split(","))
    except ValueError:
        raise InputError(
            f'--width-terms: "{text}" is not of the form GROUP=B,C with B and C in mT, such as N1=0.01,0.002'
        ) from None
    return linear, square, group


def _parts(
    results: Sequence[Result], question: Question, weights: Sequence[float]
) -> tuple[list[tuple[SpinSystem, float]], list[str]]:
    """Every spin system with its weight, and what was taken, said in sentences."""
    from ..errors import InputError
    from ..spectrum.isotopologues import spin_systems, taken_notes

    if weights and len(weights) != len(results):
        raise InputError(f"--weight: {len(weights)} given for {len(results)} results; give one for each")
    for value in weights:
        if not 0 < value < float("inf"):
            raise InputError(f"--weight: must be positive, found {value:g}")
    parts: list[tuple[SpinSystem, float]] = []
    notes: list[str] = []
    for result, weight in zip(results, weights or [1.0] * len(results), strict=True):
        systems = spin_systems(result, question)
        kept = sum(system.share for system in systems)
        parts += [(system, weight * system.share / kept) for system in systems]
        notes += taken_notes(result, systems)
        if len(results) > 1:
            notes.append(f"{result.radical}: weight {weight / sum(weights or [1.0] * len(results)):.4g}")
    return parts, notes


def _line_notes(lines: Lines) -> list[str]:
    unit = lines.axis.rpartition("_")[2]
    kinds = lines.combinations
    named = f" ({kinds} combinations of m_I)" if kinds is not None and kinds < len(lines) else ""
    span = f"from {lines.position[0]:.4f} to {lines.position[-1]:.4f} {unit}"
    return [*lines.notes, f"{len(lines)} line{'s' if len(lines) > 1 else ''}{named} {span}"]


def _curve_notes(curve: Curve, noise: float, seed: int) -> list[str]:
    unit = curve.axis.rpartition("_")[2]
    span = f"from {curve.position[0]:.4f} to {curve.position[-1]:.4f} {unit}"
    notes = [f"curve of {len(curve.position)} points {span}"]
    if noise:
        notes.append(f"noise of {noise:g} of the largest signal, seed {seed}")
    return notes


def _fit_notes(path: Path, read: MeasuredCurve, fit: Overlay) -> list[str]:
    unit = fit.axis.rpartition("_")[2]
    far = [
        f"a shift of {fit.shift:+.4f} {unit} is large: check the unit of the first column (a heading such as "
        "field_G names it), the frequency and g"
    ]
    return [
        f"{path}: {len(fit.position)} points (heading lines: {read.heading_lines}), {read.unit_note}",
        f"least squares: shift {fit.shift:+.4f} {unit}, scale {fit.scale:.5g}, residual "
        f"{100 * fit.residual:.2f} % of the measured signal (root mean square), correlation {fit.correlation:.5f}",
        *(far if fit.is_far else []),
    ]


def _plot(
    path: Path, lines: Lines, curve: Curve, sweep: Sweep, width_mT: float, fit: Overlay | None
) -> bytes:
    from ..figures.spectrum import Caption, figure_bytes, spectrum_figure

    figure = spectrum_figure(lines, curve, sweep, Caption.of(lines, sweep, width_mT), fit)
    return figure_bytes(figure, path.suffix.lower().removeprefix("."))
