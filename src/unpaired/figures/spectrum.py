"""The spectrum on paper: curve, sticks, and the tree of splittings below them, in black and greys."""

from __future__ import annotations

import io
from dataclasses import dataclass
from textwrap import wrap
from typing import TYPE_CHECKING

import numpy as np

from ..spectrum.curve import Curve
from ..spectrum.lines import Lines, joined_lines, splittings_of
from ..spectrum.multiplets import projection_counts
from ..spectrum.overlay import Overlay
from ..spectrum.splitting import Sweep
from ..spinsystem import SpinGroup, SpinSystem

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

AXIS_NAMES = {"field_mT": "magnetic field / mT", "frequency_MHz": "frequency / MHz"}
SIGNAL_NAMES = ("absorption", "first derivative", "second derivative")
MOST_BRANCHES = 150
"""A level of the tree with more branches than this would be a black bar."""
MOST_LEVELS = 8
TITLE_LETTERS, SUBTITLE_LETTERS = 62, 105
SEEN_SHARE_OF_WIDTH = 0.1
"""Groups that split by less than this share of the width are named, not drawn."""


@dataclass(frozen=True)
class Caption:
    """What stands above and beside the plot."""

    title: str
    subtitle: str
    width_mT: float

    @classmethod
    def of(cls, lines: Lines, sweep: Sweep, width_mT: float) -> Caption:
        """Radicals and levels; experiment, kind of coupling, g with its source, and findings that forbid the use."""
        names = dict.fromkeys(f"{system.radical} ({system.level})" for system in lines.systems)
        kinds = dict.fromkeys(system.coupling_kind for system in lines.systems)
        sources = dict.fromkeys(f"g = {s.g_iso:.5f}: {s.g_source}" for s in lines.systems)
        bad = dict.fromkeys(
            finding for system in lines.systems for finding in system.provenance.get("findings", ())
            if finding.endswith("(bad)")
        )  # fmt: skip
        warning = wrap(f"not to be relied on: {', '.join(bad)}", SUBTITLE_LETTERS) if bad else []
        fixed = (
            f"{sweep.frequency_MHz / 1000:g} GHz"
            if sweep.frequency_MHz is not None
            else f"{sweep.field_mT:g} mT"
        )
        return cls(
            title="\n".join(wrap(" + ".join(names), TITLE_LETTERS)),
            subtitle="\n".join(
                [
                    f"{fixed}, peak-to-peak width {width_mT:g} mT, {' and '.join(kinds)} couplings",
                    *(line for source in sources for line in wrap(source, SUBTITLE_LETTERS)),
                    *warning,
                ]
            ),
            width_mT=width_mT,
        )


def spectrum_figure(
    lines: Lines, curve: Curve, sweep: Sweep, caption: Caption, fit: Overlay | None = None
) -> Figure:
    """Curve (with the measured one and the residual if there is a fit), sticks and splitting tree.

    The tree is that of the system with the largest weight, at first order.
    """
    from matplotlib.figure import Figure

    system = lines.systems[int(np.bincount(lines.system, weights=lines.intensity).argmax())]
    levels, unseen = tree_levels(system, sweep, caption.width_mT)
    heights = [3.0] + ([0.9] if fit else []) + [0.8] + ([0.42 * len(levels) + 0.25] if levels else [])
    figure = Figure(figsize=(7.5, sum(heights) + 1.45), layout="constrained")
    panels = list(figure.subplots(len(heights), 1, sharex=True, squeeze=False, height_ratios=heights)[:, 0])
    _draw_curve(panels[0], curve, fit)
    below = panels[1:]
    if fit is not None:
        residual, below = below[0], below[1:]
        residual.plot(fit.position, fit.measured - fit.calculated, color="0.35", lw=0.7)
        residual.axhline(0, color="0.8", lw=0.6, zorder=0)
        residual.set_ylabel("measured −\ncalculated", fontsize=8)
    shift = fit.shift if fit is not None else 0.0
    _draw_sticks(below[0], lines, caption.width_mT * sweep.axis_per_mT, shift)
    if levels:
        _draw_tree(below[1], levels, sweep.centre + shift)
        below[1].set_ylabel("splittings", fontsize=8)
        remarks = [f"tree of {system.name} (largest part of the mixture)"] if len(lines.systems) > 1 else []
        remarks += [f"not drawn: {unseen}"] if unseen else []
        remark = "\n".join(line for text in remarks for line in wrap(text, SUBTITLE_LETTERS))
        below[1].set_title(remark, fontsize=7, loc="left", pad=2)
    for panel in panels:
        panel.set_yticks([])
        panel.spines[["top", "right", "left"]].set_visible(False)
    for panel in panels[:-1]:
        panel.spines["bottom"].set_visible(False)
        panel.tick_params(bottom=False)
    panels[-1].set_xlabel(AXIS_NAMES[curve.axis])
    panels[-1].ticklabel_format(axis="x", useOffset=False)
    ends = (curve.position[0] + shift, curve.position[-1] + shift)
    panels[-1].set_xlim(*ends)
    figure.suptitle(caption.title, fontsize=11, fontweight="bold", x=0.02, ha="left")
    panels[0].set_title(caption.subtitle, fontsize=8, loc="left")
    return figure


def figure_bytes(figure: Figure, kind: str) -> bytes:
    """The figure as `svg` or `png`; equal figures give equal files."""
    import matplotlib as mpl

    buffer = io.BytesIO()
    with mpl.rc_context({"svg.hashsalt": "unpaired", "svg.fonttype": "none"}):
        metadata = {"Date": None} if kind == "svg" else {"Software": None}
        figure.savefig(buffer, format=kind, dpi=200, metadata=metadata)
    return buffer.getvalue()


@dataclass(frozen=True, eq=False)
class TreeLevel:
    """One group in the tree."""

    label: str
    parents: np.ndarray[tuple[int], np.dtype[np.float64]]
    """Displacements from the centre above this level, one per branch."""
    children: np.ndarray[tuple[int], np.dtype[np.float64]]
    """Displacements below it."""


def tree_levels(system: SpinSystem, sweep: Sweep, width_mT: float) -> tuple[list[TreeLevel], str]:
    """Levels of the tree, largest coupling first, and the names of the groups that are not drawn."""
    pairs = sorted(
        zip(system.groups, splittings_of(system), strict=True), key=lambda pair: -abs(pair[1].coupling_MHz)
    )
    levels: list[TreeLevel] = []
    unseen: list[str] = []
    ends = np.zeros(1)
    for group, splitting in pairs:
        spacing = splitting.coupling_MHz * sweep.axis_per_MHz
        top = splitting.count * splitting.twice_spin
        offsets = spacing * (np.arange(top + 1) - top / 2)
        too_many = len(ends) * len(offsets) > MOST_BRANCHES or len(levels) == MOST_LEVELS
        if unseen or too_many or abs(spacing) < SEEN_SHARE_OF_WIDTH * width_mT * sweep.axis_per_mT:
            unseen.append(f"{group.group} ({abs(group.a_iso_mT):.3g} mT)")
            continue
        children = np.add.outer(ends, offsets).ravel()
        levels.append(TreeLevel(_label(group), np.repeat(ends, len(offsets)), children))
        ends = np.unique(np.round(children, 9))
    return levels, ", ".join(unseen)


def _label(group: SpinGroup) -> str:
    counts = projection_counts(group.count, round(2 * group.nuclear_spin))
    ratio = ":".join(str(count) for count in counts) if len(counts) <= 7 else f"{len(counts)} lines"
    value = f"{group.a_iso_mT:+.3f}".replace("-", "\N{MINUS SIGN}")
    many = f"{group.count} × " if group.count > 1 else ""
    return f"{group.group}: {many}{group.isotope}  {value} mT\n{ratio}"


def _draw_curve(panel: Axes, curve: Curve, fit: Overlay | None) -> None:
    if fit is None:
        panel.plot(curve.position, curve.signal, color="black", lw=0.9)
        panel.set_ylabel(SIGNAL_NAMES[curve.derivative], fontsize=8)
    else:
        panel.plot(fit.position, fit.measured, color="0.65", lw=2.6, label="measured", solid_capstyle="round")
        panel.plot(
            curve.position + fit.shift, fit.scale * curve.signal, color="black", lw=0.8, label="calculated"
        )
        panel.legend(frameon=False, fontsize=8, loc="upper right")
        panel.set_ylabel(f"{SIGNAL_NAMES[curve.derivative]}, scaled", fontsize=8)


def _draw_sticks(panel: Axes, lines: Lines, width: float, shift: float) -> None:
    """One stick per line, those that nobody could tell apart drawn as one."""
    position, intensity = joined_lines(lines.position, lines.intensity, width / 50)
    panel.vlines(position + shift, 0, intensity / intensity.max(), color="black", lw=0.8)
    panel.set_ylim(0, 1.08)
    panel.axhline(0, color="black", lw=0.6)
    panel.set_ylabel("lines", fontsize=8)


def _draw_tree(panel: Axes, levels: list[TreeLevel], centre: float) -> None:
    """Branches from above to below, one level per group, the group's name at the right of its level."""
    from matplotlib.collections import LineCollection

    depth = len(levels)
    panel.plot([centre, centre], [depth + 0.2, depth], color="black", lw=0.8)
    for place, level in enumerate(levels):
        upper = depth - place
        segments = [
            [(centre + parent, upper), (centre + child, upper - 0.55), (centre + child, upper - 1)]
            for parent, child in zip(level.parents, level.children, strict=True)
        ]
        thin = 0.8 if len(segments) < 40 else 0.5
        panel.add_collection(LineCollection(segments, colors="black", linewidths=thin))
        panel.text(
            1.01,
            (upper - 0.5 + 0.05) / (depth + 0.25),
            level.label,
            transform=panel.transAxes,
            fontsize=7,
            va="center",
            ha="left",
        )
    panel.set_ylim(0, depth + 0.25)
