"""The curve on the recorder: every line drawn with its shape, on an even grid."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.signal import fftconvolve

from ..errors import InputError, nearest
from .lines import ABSENT, Lines
from .shapes import Shape, line

FloatArray = NDArray[np.float64]
Mask = NDArray[np.bool_]

POINTS_PER_WIDTH = 20
MARGIN_WIDTHS = 6
"""The range reaches this many widths beyond the outermost lines unless it is given."""
WING_WIDTHS = 500
LEAST_POINTS = 2001
MOST_POINTS = 2_000_000


@dataclass(frozen=True)
class Width:
    """Peak-to-peak width A + B m + C m^2 of a line, m being m_I of one group; in mT."""

    constant_mT: float
    linear_mT: float = 0.0
    square_mT: float = 0.0
    group: str | None = None
    """None if the width is the same for all lines."""


@dataclass(frozen=True, eq=False)
class Curve:
    """A signal on an even grid."""

    axis: str
    position: FloatArray
    """Unit of the axis, ascending, evenly spaced."""
    signal: FloatArray
    """Intensity per unit of the axis to the power 1 + derivative."""
    derivative: int


def draw(
    lines: Lines,
    width: Width,
    shape: Shape,
    axis_per_mT: float,
    limits: tuple[float | None, float | None] = (None, None),
    points: int | None = None,
) -> Curve:
    """The sum of all lines.

    `width` is in mT and `axis_per_mT` turns it into units of the axis; all else in `shape` and `limits`
    (lower and upper end, None for chosen from the lines) is in units of the axis. Raises InputError for a
    width that is not positive at some line, a range that holds no line, or a grid that would be too long.
    """
    parts = _by_width(lines, width, axis_per_mT)
    narrowest = min(part_width for part_width, _ in parts)
    first, last = _range(lines, max(part_width for part_width, _ in parts), limits)
    if points is not None and not 2 <= points <= MOST_POINTS:
        raise InputError(f"a curve has 2 to {MOST_POINTS} points, found {points}")
    resolving = max(LEAST_POINTS, math.ceil((last - first) / narrowest * POINTS_PER_WIDTH) + 1)
    number = resolving if points is None else points
    step = (last - first) / (number - 1)
    finer = max(1, math.ceil(step / narrowest * POINTS_PER_WIDTH))
    if (number - 1) * finer + 1 > MOST_POINTS:
        raise InputError(
            f"a width of {narrowest:g} over a range of {last - first:g} needs more than {MOST_POINTS} points; "
            "narrow the range or widen the lines"
        )
    signal = np.zeros((number - 1) * finer + 1)
    for part_width, chosen in parts:
        here = replace(shape, peak_to_peak_width=part_width)
        signal += _drawn(
            lines.position[chosen], lines.intensity[chosen], here, first, step / finer, len(signal)
        )
    return Curve(lines.axis, np.linspace(first, last, number), signal[::finer], shape.derivative)


def with_noise(curve: Curve, share: float, seed: int) -> Curve:
    """The curve with normal noise, its standard deviation a share of the largest signal."""
    if not (math.isfinite(share) and share >= 0):
        raise InputError(f"the noise cannot be negative, found {share:g}")
    if seed < 0:
        raise InputError(f"the seed of the noise cannot be negative, found {seed}")
    noise = np.random.default_rng(seed).normal(size=len(curve.signal))
    return replace(curve, signal=curve.signal + share * np.abs(curve.signal).max() * noise)


def curve_csv(curve: Curve) -> str:
    """Columns `field_mT` (or `frequency_MHz`) and `signal`."""
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    writer.writerow([curve.axis, "signal"])
    writer.writerows(zip(curve.position.tolist(), curve.signal.tolist(), strict=True))
    return buffer.getvalue()


def _by_width(lines: Lines, width: Width, axis_per_mT: float) -> list[tuple[float, Mask]]:
    """Widths in units of the axis, each with the mask of its lines."""
    if width.group is None:
        return [(width.constant_mT * axis_per_mT, np.ones(len(lines), dtype=bool))]
    if width.group not in lines.groups:
        raise InputError(
            f'group "{width.group}" of the width is not in the line list{nearest(width.group, lines.groups)} '
            f"(there are {', '.join(lines.groups) or 'none'})"
        )
    if lines.twice_m is None:
        raise InputError("widths cannot depend on m_I where there are too many lines to name")
    twice_m = lines.twice_m[:, lines.groups.index(width.group)]
    return [(here * axis_per_mT, mask) for here, mask in _widths(twice_m, width)]


def _widths(twice_m: NDArray[np.int16], width: Width) -> Iterator[tuple[float, Mask]]:
    for value in np.unique(twice_m):
        m = 0.0 if value == ABSENT else value / 2
        here = width.constant_mT + width.linear_mT * m + width.square_mT * m * m
        if not here > 0:
            raise InputError(
                f"the width {width.constant_mT:g} + {width.linear_mT:g} m + {width.square_mT:g} m^2 mT is "
                f"{here:g} mT at m = {m:g} of {width.group}: it must be positive for every line"
            )
        yield here, twice_m == value


def _range(lines: Lines, width: float, limits: tuple[float | None, float | None]) -> tuple[float, float]:
    low, high = float(lines.position[0]), float(lines.position[-1])
    first = low - MARGIN_WIDTHS * width if limits[0] is None else limits[0]
    last = high + MARGIN_WIDTHS * width if limits[1] is None else limits[1]
    unit = lines.axis.rpartition("_")[2]
    if not (math.isfinite(first) and math.isfinite(last) and first < last):
        raise InputError(f"the range must rise, found {first:g} to {last:g} {unit}")
    if not np.any((lines.position >= first) & (lines.position <= last)):
        raise InputError(
            f"no line lies between {first:g} and {last:g} {unit}; the lines lie from {low:.4f} to {high:.4f}"
        )
    return first, last


def _drawn(
    position: FloatArray, intensity: FloatArray, shape: Shape, first: float, step: float, number: int
) -> FloatArray:
    """Lines on a grid that resolves them.

    Every line is shared out over its four nearest grid points by cubic interpolation, which keeps its moments
    up to the third, and the comb is then convolved with one line. Lines outside the grid are drawn too, so
    that their wings are not lost, up to `WING_WIDTHS` away.
    """
    reach_out = WING_WIDTHS * shape.peak_to_peak_width + shape.modulation
    near = (position > first - reach_out) & (position < first + step * number + reach_out)
    position, intensity = position[near], intensity[near]
    if not len(position):
        return np.zeros(number)
    place = (position - first) / step
    cell = np.floor(place).astype(np.int64)
    t = place - cell
    shares = (
        -t * (t - 1) * (t - 2) / 6,
        (t + 1) * (t - 1) * (t - 2) / 2,
        -(t + 1) * t * (t - 2) / 2,
        (t + 1) * t * (t - 1) / 6,
    )
    lowest = int(cell.min()) - 1
    length = int(cell.max()) + 3 - lowest
    comb = np.zeros(length)
    for offset, share in enumerate(shares):
        comb += np.bincount(cell - 1 + offset - lowest, weights=share * intensity, minlength=length)
    # Point p of the grid is the sum over q of comb[q] * line((p - lowest - q) * step).
    reach = step * np.arange(-lowest - length + 1, number - lowest, dtype=np.float64)
    full = fftconvolve(line(reach, shape), comb, mode="full")
    drawn: FloatArray = full[length - 1 : length - 1 + number]
    return drawn
