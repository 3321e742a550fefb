"""Plot of the spin density in a plane: filled contours around zero, nuclei marked and labelled."""

from __future__ import annotations

import io

import numpy as np
from numpy.typing import NDArray

from ..constants import BOHR_ANGSTROM
from ..density import PlaneDensity
from ..molecule import Molecule
from ..properties.grids import FLAT_BOHR

HIGHEST_SHARE = 0.5
"""Contours end at this share of the largest value outside the cores, or colours would show nothing else."""
CORE_BOHR = 0.35
DECADES = 2.5


def contour_levels(density: PlaneDensity, molecule: Molecule) -> NDArray[np.float64]:
    """Levels symmetric about zero, four per factor of ten: spin densities span decades."""
    seen, heights = density.plane.seen(molecule.coordinates_bohr)
    away = np.full(density.values_au.shape, True)
    for (x, y), height in zip(seen, heights, strict=True):
        if abs(height) < CORE_BOHR:
            distance = np.hypot(density.across_bohr[None, :] - x, density.upwards_bohr[:, None] - y)
            away &= distance > CORE_BOHR
    largest = float(np.abs(density.values_au[away]).max())
    if largest == 0:
        largest = 1.0
    steps = np.arange(int(4 * DECADES) + 1)
    upper = HIGHEST_SHARE * largest * 10.0 ** (-steps[::-1] / 4)
    return np.concatenate([-upper[::-1], upper])


def density_figure(density: PlaneDensity, molecule: Molecule, title: str, file_format: str) -> bytes:
    """The plot as SVG or PNG. Positive density is red with full lines, negative blue with dashed lines."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.colors import BoundaryNorm
    from matplotlib.figure import Figure

    levels = contour_levels(density, molecule)
    x, y = density.across_bohr * BOHR_ANGSTROM, density.upwards_bohr * BOHR_ANGSTROM
    width = 6.0
    figure = Figure(
        figsize=(width + 1.2, min(9.0, width * np.ptp(y) / np.ptp(x) + 0.9)), layout="constrained"
    )
    FigureCanvasAgg(figure)
    panel = figure.subplots()
    norm = BoundaryNorm(levels, ncolors=256, extend="both")
    filled = panel.contourf(x, y, density.values_au, levels, cmap="RdBu_r", norm=norm, extend="both")
    for chosen, style in ((levels[levels > 0], "solid"), (levels[levels < 0], "dashed")):
        panel.contour(x, y, density.values_au, chosen, colors="0.25", linewidths=0.45, linestyles=style)
    seen, heights = density.plane.seen(molecule.coordinates_bohr)
    for (across, upwards), height, label in zip(seen * BOHR_ANGSTROM, heights, molecule.labels, strict=True):
        inside = abs(height) < FLAT_BOHR
        panel.plot(
            [across],
            [upwards],
            "o",
            markersize=4,
            color="black",
            markerfacecolor="black" if inside else "white",
        )
        panel.annotate(
            label,
            (across, upwards),
            xytext=(5, 5),
            textcoords="offset points",
            fontsize=9,
            color="black" if inside else "0.35",
            bbox={"boxstyle": "round,pad=0.12", "facecolor": "white", "edgecolor": "none", "alpha": 0.75},
        )
    upper = levels[levels > 0][::-4][::-1]
    ticks = [*-upper[::-1], *upper]
    bar = figure.colorbar(filled, ax=panel, shrink=0.92, ticks=ticks)
    bar.ax.set_yticklabels([f"{tick:+.0e}" if abs(tick) < 0.01 else f"{tick:+.2g}" for tick in ticks])
    bar.set_label("spin density / bohr$^{-3}$")
    panel.set_aspect("equal")
    panel.set_xlabel("Å")
    panel.set_ylabel("Å")
    panel.set_title(title, fontsize=11)
    if np.any(np.abs(heights) >= FLAT_BOHR):
        panel.text(0.01, 0.01, "open circles: nuclei out of the plane", transform=panel.transAxes, fontsize=8)
    buffer = io.BytesIO()
    figure.savefig(
        buffer, format=file_format, dpi=160, metadata={"Date": None} if file_format == "svg" else None
    )
    return buffer.getvalue()
