"""Plot of levels side by side: one row per group, one marker per level."""

from __future__ import annotations

import io
from collections.abc import Sequence
from typing import Any

from ..contrast import Contrast, Value, column_titles

SHAPES = {
    "ROHF": ("s", "white"),
    "UHF projected": ("D", "white"),
    "UHF": ("D", "filled"),
    "ROKS": ("o", "white"),
    "UKS": ("o", "filled"),
}
"""Marker and filling of a treatment: open symbols have no polarisation or less of it."""
FAMILY = {"UHF": "#1f3b73", "KS": "#c8661a"}
"""Dark blue and orange: their greys are far apart."""
OTHERS = ("^", "v", "P", "X", "<", ">")
"""Markers of a second, third, ... level of one treatment."""
ROW_INCHES = 0.42


def contrast_figure(contrasts: Sequence[Contrast], file_format: str) -> bytes:
    """The plot as SVG or PNG. One panel per isotope with its own scale, since couplings differ by decades."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    isotopes = list(dict.fromkeys(entry.isotope for entry in contrasts))
    of = {isotope: [entry for entry in contrasts if entry.isotope == isotope] for isotope in isotopes}
    titles = column_titles(contrasts)
    legend_rows = (len(titles) + 3) // 2
    height = 0.8 + 0.22 * legend_rows + sum(ROW_INCHES * len(rows) + 0.62 for rows in of.values())
    figure = Figure(figsize=(7.2, height), layout="constrained")
    FigureCanvasAgg(figure)
    panels = figure.subplots(
        len(isotopes), 1, squeeze=False, height_ratios=[len(rows) + 0.8 for rows in of.values()]
    )[:, 0]
    handles: dict[str, Any] = {}
    for panel, isotope in zip(panels, isotopes, strict=True):
        _panel(panel, of[isotope], titles, handles)
        panel.set_xlabel(f"{isotope} coupling / mT", labelpad=2)
    figure.suptitle(contrasts[0].radical, fontsize=12)
    ordered = [
        title
        for title in (*titles, "projected to plain UHF", "measured", "measured, sign unknown")
        if title in handles
    ]
    figure.legend(
        [handles[title] for title in ordered],
        ordered,
        loc="outside lower center",
        ncols=2,
        frameon=False,
        fontsize=8.5,
    )
    buffer = io.BytesIO()
    figure.savefig(
        buffer, format=file_format, dpi=160, metadata={"Date": None} if file_format == "svg" else None
    )
    return buffer.getvalue()


def _panel(panel: Any, rows: Sequence[Contrast], titles: Sequence[str], handles: dict[str, Any]) -> None:
    panel.axvline(0, color="black", linewidth=0.9, zorder=1)
    for place, entry in enumerate(rows):
        panel.axhline(place, color="0.9", linewidth=0.8, zorder=0)
        _span(panel, place, entry, handles)
        for value in entry.values:
            handles[value.title] = _mark(panel, place, value, _repetition(value, entry.values))
        for known in entry.measured:
            title = "measured" if known.signed else "measured, sign unknown"
            style = "-" if known.signed else (0, (2, 1.4))
            both = [known.coupling_mT] if known.signed else [-known.coupling_mT, known.coupling_mT]
            for value_mT in both:
                (line,) = panel.plot(
                    [value_mT, value_mT],
                    [place - 0.36, place + 0.36],
                    color="black",
                    linewidth=2.2 if known.signed else 1.6,
                    linestyle=style,
                    zorder=2,
                )
                handles[title] = line
    panel.set_yticks(range(len(rows)), [_row_title(entry) for entry in rows])
    panel.set_ylim(len(rows) - 0.45, -0.55)
    panel.margins(x=0.06)
    panel.tick_params(axis="y", length=0)
    for side in ("top", "right", "left"):
        panel.spines[side].set_visible(False)


def _span(panel: Any, place: int, entry: Contrast, handles: dict[str, Any]) -> None:
    """A grey bar from projected to plain UHF of one level."""
    plain = {value.level: value.coupling_mT for value in entry.values if value.treatment == "UHF"}
    for value in entry.values:
        if value.treatment == "UHF projected":
            ends = [value.coupling_mT, plain[value.level]]
            (line,) = panel.plot(
                ends, [place, place], color="0.78", linewidth=6, solid_capstyle="butt", zorder=1.5
            )
            handles["projected to plain UHF"] = line


def _mark(panel: Any, place: int, value: Value, repetition: int) -> Any:
    shape, filling = SHAPES[value.treatment]
    colour = FAMILY["KS" if value.treatment.endswith("KS") else "UHF"]
    (mark,) = panel.plot(
        [value.coupling_mT],
        [place],
        linestyle="none",
        marker=shape if repetition == 0 else OTHERS[(repetition - 1) % len(OTHERS)],
        markersize=10.5 if value.treatment == "ROHF" else 7.5,
        markerfacecolor="white" if filling == "white" else colour,
        markeredgecolor=colour,
        markeredgewidth=1.4,
        zorder=4 if filling == "white" else 3,
    )
    return mark


def _repetition(value: Value, values: Sequence[Value]) -> int:
    """0 for the first level of a treatment, 1 for the second, ..."""
    return [other.title for other in values if other.treatment == value.treatment].index(value.title)


def _row_title(entry: Contrast) -> str:
    count = len(entry.nuclei)
    return entry.group if count == 1 else f"{entry.group}  ×{count}"
