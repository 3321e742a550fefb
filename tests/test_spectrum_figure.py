"""The plot: grey throughout, no words over each other, a tree that ends where the lines are."""

from __future__ import annotations

import io
from dataclasses import replace
from itertools import combinations

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.image import imread
from matplotlib.text import Text
from spin_samples import system

from unpaired.constants import ELECTRON_G
from unpaired.figures.spectrum import Caption, figure_bytes, spectrum_figure, tree_levels
from unpaired.spectrum.curve import Width, draw
from unpaired.spectrum.lines import line_list
from unpaired.spectrum.measured_curve import MeasuredCurve
from unpaired.spectrum.overlay import overlay
from unpaired.spectrum.shapes import Shape
from unpaired.spectrum.splitting import Sweep
from unpaired.spinsystem import SpinSystem

METHYL = system(("13C", 1, 3.8), ("1H", 3, -2.3), radical="methyl")
MANY = system(
    *[
        ("14N", 2, -0.42),
        ("14N", 2, 0.0),
        ("1H", 4, -0.133),
        ("1H", 4, -0.16),
        ("1H", 6, 0.4),
        ("1H", 1, 2.3),
    ],
    radical="a radical with a name that is long enough to need two lines in the title of a plot",
)
SWEEP = Sweep(ELECTRON_G, frequency_MHz=9500.0)


def plot(*systems: SpinSystem, fitted: bool = False, width_mT: float = 0.05) -> Figure:
    lines = line_list([(one, 1.0) for one in systems], frequency_MHz=9500.0, width_mT=width_mT)
    curve = draw(lines, Width(width_mT), Shape(width_mT), 1.0)
    fit = None
    if fitted:
        fit = overlay(curve, MeasuredCurve("field_mT", curve.position + 0.4, 7 * curve.signal, 0, ""))
    return spectrum_figure(lines, curve, lines.sweep, Caption.of(lines, lines.sweep, width_mT), fit)


def test_a_level_that_must_not_be_used_is_called_so_in_the_plot() -> None:
    doubtful = replace(METHYL, provenance={"findings": ["contaminated (bad)", "basis-at-nucleus (note)"]})
    texts = [text.get_text() for text in plot(doubtful).findobj(Text)]
    assert any(text.endswith("not to be relied on: contaminated (bad)") for text in texts)
    assert not any("relied on" in text.get_text() for text in plot(METHYL).findobj(Text))


@pytest.mark.parametrize(
    "figure",
    [
        lambda: plot(METHYL),
        lambda: plot(MANY),
        lambda: plot(METHYL, MANY),
        lambda: plot(METHYL, fitted=True),
        lambda: plot(system(("1H", 2, 0.0))),
        lambda: plot(*(system(("1H", k + 1, 1.0), g_iso=2 + k / 1000) for k in range(4))),
    ],
    ids=["methyl", "many", "two", "fitted", "no coupling", "four g values"],
)
def test_no_words_lie_over_each_other_or_leave_the_page(figure: object) -> None:
    drawn: Figure = figure()  # type: ignore[operator]
    FigureCanvasAgg(drawn).draw()
    texts = [text for text in drawn.findobj(Text) if text.get_visible() and text.get_text().strip()]
    boxes = [(text.get_text(), text.get_window_extent()) for text in texts]
    ticks = {label for axes in drawn.axes for label in axes.get_xticklabels()}
    page = drawn.bbox
    outside = [
        words
        for (words, box), text in zip(boxes, texts, strict=True)
        if text not in ticks
        and not (page.x0 <= box.x0 and box.x1 <= page.x1 and box.y0 >= page.y0 and box.y1 <= page.y1)
    ]
    assert outside == []
    crossing = [(a, b) for (a, one), (b, other) in combinations(boxes, 2) if one.overlaps(other)]
    assert crossing == []


def test_the_plot_is_grey() -> None:
    image = imread(io.BytesIO(figure_bytes(plot(METHYL, fitted=True), "png")))
    assert np.array_equal(image[..., 0], image[..., 1])
    assert np.array_equal(image[..., 1], image[..., 2])


def test_equal_plots_are_equal_files() -> None:
    assert figure_bytes(plot(METHYL), "svg") == figure_bytes(plot(METHYL), "svg")


def test_the_tree_ends_at_the_first_order_lines() -> None:
    levels, unseen = tree_levels(METHYL, SWEEP, 0.05)
    lines = line_list([(METHYL, 1.0)], frequency_MHz=9500.0, width_mT=0.05, order="first")
    offset = lines.position - lines.sweep.centre
    ends = np.sort(levels[-1].children)
    # the sweep of the tree has another g than the system: the offsets scale
    assert ends == pytest.approx(np.sort(offset) * 2.0 / ELECTRON_G, rel=1e-9)
    assert [len(level.children) for level in levels] == [2, 8]
    assert unseen == ""


def test_groups_that_cannot_be_drawn_are_named() -> None:
    levels, unseen = tree_levels(MANY, SWEEP, 0.05)
    assert [level.label.split(":")[0] for level in levels] == ["H19", "N1", "H13"]
    assert unseen == "H9 (0.16 mT), H5 (0.133 mT), N3 (0 mT)"
