"""A calculated curve laid over a measured one: shift and scale by least squares."""

from __future__ import annotations

import csv
import io
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from .curve import Curve
from .measured_curve import MeasuredCurve

FloatArray = NDArray[np.float64]

FAR_SHARE = 0.02
"""A shift by more than this share of the field is worth a remark: g would be off by 0.04."""


@dataclass(frozen=True, eq=False)
class Overlay:
    """The calculated curve on the measured grid, signal(x) = scale * calculated(x - shift)."""

    axis: str
    position: FloatArray
    measured: FloatArray
    calculated: FloatArray
    """Shifted and scaled."""
    shift: float
    """In units of the axis; positive moves the calculated curve to higher field."""
    scale: float
    residual: float
    """Root mean square of measured - calculated, as a share of the root mean square of measured."""
    correlation: float
    """Pearson's, between measured and calculated."""

    @property
    def is_far(self) -> bool:
        """Whether the shift is larger than any usual error of g or of the field."""
        return abs(self.shift) > FAR_SHARE * float(np.abs(self.position).mean())


def overlay(curve: Curve, measured: MeasuredCurve) -> Overlay:
    """Find the shift and the positive scale that minimise sum (measured - scale * calculated(x - shift))^2.

    For every shift the best scale is linear; the shift is searched over all that let the two overlap, then
    refined. Raises InputError if the axes differ or no positive scale brings the curves together.
    """
    if curve.axis != measured.axis:
        raise InputError(
            f"the measured spectrum is over {measured.axis}, the calculated one over {curve.axis}"
        )
    from scipy.optimize import minimize_scalar

    x, y = measured.position, measured.signal
    step = min(float(np.diff(curve.position).min()), float(np.diff(x).min() * 4), float(np.ptp(x)) / 500)
    step = max(step, (np.ptp(x) + np.ptp(curve.position)) / 200_000)
    start = _best_coarse_shift(curve, x, y, step)

    def gain(shift: float) -> float:
        """Share of the measured sum of squares that is explained (0 to 1)."""
        model = _moved(curve, x, shift)
        product, norm = float(y @ model), float(model @ model)
        return product**2 / (norm * float(y @ y)) if norm > 0 and product > 0 else 0.0

    found = minimize_scalar(
        lambda shift: -gain(shift),
        bounds=(start - 2 * step, start + 2 * step),
        method="bounded",
        options={"xatol": 1e-6 * step},
    )
    shift = float(found.x) if gain(float(found.x)) >= gain(start) else start
    model = _moved(curve, x, shift)
    if not gain(shift):
        raise InputError("no shift brings the calculated curve onto the measured one: check range and units")
    scale = float(y @ model) / float(model @ model)
    fitted = scale * model
    return Overlay(
        axis=curve.axis,
        position=x,
        measured=y,
        calculated=fitted,
        shift=shift,
        scale=scale,
        residual=float(np.sqrt(np.mean((y - fitted) ** 2) / np.mean(y**2))),
        correlation=float(np.corrcoef(y, fitted)[0, 1]),
    )


def overlay_csv(fit: Overlay) -> str:
    """Columns `field_mT` (or `frequency_MHz`), `signal` (calculated, shifted and scaled) and `measured`."""
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    writer.writerow([fit.axis, "signal", "measured"])
    columns = (fit.position.tolist(), fit.calculated.tolist(), fit.measured.tolist())
    writer.writerows(zip(*columns, strict=True))
    return buffer.getvalue()


def _moved(curve: Curve, x: FloatArray, shift: float) -> FloatArray:
    """The calculated curve at x - shift; nothing outside its range."""
    moved: FloatArray = np.interp(x - shift, curve.position, curve.signal, left=0.0, right=0.0)
    return moved


def _best_coarse_shift(curve: Curve, x: FloatArray, y: FloatArray, step: float) -> float:
    """The best of all shifts in multiples of `step`, by correlation on even grids."""
    from scipy.signal import correlate

    grid = np.arange(x[0], x[-1] + step, step)
    own = np.arange(curve.position[0], curve.position[-1] + step, step)
    wanted = np.interp(grid, x, y, left=0.0, right=0.0)
    model = np.interp(own, curve.position, curve.signal, left=0.0, right=0.0)
    product = correlate(wanted, model, mode="full", method="fft")
    # Sum of squares of that part of the model which falls on the measured grid, for every shift.
    norm = correlate(np.ones_like(wanted), model**2, mode="full", method="fft")
    seen = norm > 1e-6 * float(model @ model)
    explained = np.where(seen & (product > 0), product**2 / np.where(seen, norm, 1.0), 0.0)
    lag = int(explained.argmax()) - (len(own) - 1)
    return float(grid[0] + lag * step - own[0])
