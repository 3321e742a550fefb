"""The line list: patterns of known radicals, laws, the choice of the order, refusals."""

from __future__ import annotations

import csv
import io
import time
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from spin_samples import system

from unpaired.errors import ChoiceError, InputError
from unpaired.spectrum.curve import Width, draw
from unpaired.spectrum.lines import Lines, joined_lines, line_list, lines_csv
from unpaired.spectrum.shapes import Shape
from unpaired.spinsystem import SpinSystem


def lines_of(one: SpinSystem, order: str = "auto", width_mT: float = 0.1) -> Lines:
    return line_list([(one, 1.0)], frequency_MHz=9500.0, width_mT=width_mT, order=order)


def peaks(lines: Lines, width_mT: float) -> int:
    """Maxima of the absorption, those above a thousandth of the highest."""
    curve = draw(lines, Width(width_mT), Shape(width_mT, derivative=0), 1.0)
    inner = curve.signal[1:-1]
    tops = (inner > curve.signal[:-2]) & (inner > curve.signal[2:]) & (inner > 1e-3 * curve.signal.max())
    return int(tops.sum())


NAPHTHALENE = system(("1H", 4, -0.495), ("1H", 4, -0.183))
SEMIQUINONE = system(("1H", 4, -0.237))


def test_naphthalene_anion_has_25_lines() -> None:
    # 5 x 5 lines: common practice. Couplings: Atherton and Weissman, J. Am. Chem. Soc. 83, 1330 (1961), from memory.
    lines = lines_of(NAPHTHALENE, "first")
    assert len(lines) == 25
    assert peaks(lines_of(NAPHTHALENE), 0.01) == 25


def test_semiquinone_anion_has_5_lines_of_binomial_intensity() -> None:
    # Common practice. Coupling: Venkataraman and Fraenkel, J. Am. Chem. Soc. 77, 2707 (1955), from memory.
    lines = lines_of(SEMIQUINONE, "first")
    assert lines.intensity * 16 == pytest.approx([1, 4, 6, 4, 1], abs=1e-12)
    assert np.diff(lines.position) == pytest.approx([0.237 * 2.00231930436092 / 2.0] * 4, abs=1e-9)
    assert peaks(lines_of(SEMIQUINONE), 0.02) == 5


groups = st.lists(
    st.tuples(
        st.sampled_from(["1H", "2H", "13C", "14N", "35Cl"]),
        st.integers(1, 3),
        st.floats(-3, 3).map(lambda value: round(value, 3)),
    ),
    max_size=4,
)


def spectrum(lines: Lines) -> list[tuple[float, float]]:
    """Positions and intensities, coinciding lines added up."""
    found: dict[float, float] = {}
    for position, intensity in zip(lines.position, lines.intensity, strict=True):
        key = next((known for known in found if abs(known - position) < 1e-7), float(position))
        found[key] = found.get(key, 0.0) + float(intensity)
    return sorted(found.items())


def same(one: list[tuple[float, float]], other: list[tuple[float, float]]) -> bool:
    return len(one) == len(other) and bool(np.allclose(one, other, rtol=0, atol=1e-7))


@settings(deadline=None, max_examples=40)
@given(groups, st.randoms())
def test_the_order_of_the_groups_changes_nothing(
    chosen: list[tuple[str, int, float]], random: object
) -> None:
    mixed = list(chosen)
    random.shuffle(mixed)  # type: ignore[attr-defined]
    assert same(spectrum(lines_of(system(*chosen), "first")), spectrum(lines_of(system(*mixed), "first")))


@settings(deadline=None, max_examples=40)
@given(groups.filter(bool))
def test_splitting_a_group_in_two_changes_no_first_order_line(chosen: list[tuple[str, int, float]]) -> None:
    name, count, coupling = chosen[0]
    apart = [(name, 1, coupling), (name, count, coupling), *chosen[1:]]
    together = [(name, count + 1, coupling), *chosen[1:]]
    assert same(spectrum(lines_of(system(*apart), "first")), spectrum(lines_of(system(*together), "first")))


@settings(deadline=None, max_examples=40)
@given(groups)
def test_negating_all_couplings_mirrors_the_first_order_spectrum(
    chosen: list[tuple[str, int, float]],
) -> None:
    lines = lines_of(system(*chosen), "first")
    mirrored = lines_of(system(*((name, count, -a) for name, count, a in chosen)), "first")
    centre = lines.sweep.centre
    assert same(sorted((2 * centre - b, w) for b, w in spectrum(lines)), spectrum(mirrored))


@settings(deadline=None, max_examples=25)
@given(groups, st.sampled_from(["first", "second", "exact"]))
def test_intensities_sum_to_one(chosen: list[tuple[str, int, float]], order: str) -> None:
    few = [(name, 1, coupling) for name, _, coupling in chosen[:3]]
    assert lines_of(system(*few), order).intensity.sum() == pytest.approx(1.0, abs=1e-12)


@settings(deadline=None, max_examples=25)
@given(groups)
def test_curve_and_lines_have_the_same_first_moment(chosen: list[tuple[str, int, float]]) -> None:
    lines = lines_of(system(*chosen), "first")
    curve = draw(lines, Width(0.1), Shape(0.1, derivative=0), 1.0)
    moment = np.trapezoid(curve.signal * (curve.position - lines.sweep.centre), curve.position)
    assert moment == pytest.approx(lines.intensity @ (lines.position - lines.sweep.centre), abs=1e-6)


def test_equal_couplings_are_treated_as_one_group_beyond_first_order() -> None:
    apart = lines_of(system(("1H", 1, 2.3), ("1H", 2, 2.3)), "exact")
    together = lines_of(system(("1H", 3, 2.3)), "exact")
    assert same(spectrum(apart), spectrum(together))
    assert "H1, H2 have equal couplings" in " ".join(apart.notes)


def test_close_couplings_are_warned_of_in_second_order() -> None:
    assert "second order mixes them" in " ".join(
        lines_of(system(("1H", 1, 2.3), ("1H", 1, 2.31)), "second").notes
    )


@pytest.mark.parametrize("order", ["exact", "second", "first"])
def test_a_group_without_coupling_multiplies_no_lines(order: str) -> None:
    lines = lines_of(system(("1H", 1, 2.0), ("13C", 1, 0.0)), order)
    assert len(lines) == 2
    assert [row["m_I_C2"] for row in csv.DictReader(io.StringIO(lines_csv(lines)))] == ["", ""]
    assert "C2 split nothing" in " ".join(lines.notes)


def test_a_radical_without_couplings_has_one_line() -> None:
    for order in ("exact", "second", "first"):
        lines = lines_of(system(("1H", 2, 0.0)), order)
        assert lines.position == pytest.approx([lines.sweep.centre], abs=1e-9)
        assert lines.intensity.tolist() == [1.0]


@pytest.mark.parametrize(
    ("one", "width_mT", "word"),
    [
        (system(("1H", 3, -2.3)), 0.1, "exact"),  # 0.0078 mT against 0.1 mT
        (system(("1H", 3, -2.3)), 1.0, "second order"),
        (system(("1H", 4, -0.2)), 0.1, "second order"),
        (system(("1H", 11, -2.3)), 0.1, "second order"),  # 2048 states
    ],
)
def test_the_order_is_chosen_from_the_shift_against_the_width(
    one: SpinSystem, width_mT: float, word: str
) -> None:
    note = lines_of(one, width_mT=width_mT).notes[0]
    assert word in note.split(":")[1]
    assert "a*a/(2 B0)" in note


def test_what_second_order_leaves_out_is_said_where_it_could_be_seen() -> None:
    small, large = (lines_of(system(("19F", 11, a)), width_mT=0.1) for a in (1.0, 20.0))
    assert "leaves out" not in small.notes[0]
    assert "what it leaves out is of the size of 0.0" in large.notes[0]


def test_exact_is_refused_beyond_1024_states() -> None:
    with pytest.raises(InputError, match="at most 1024 nuclear states, here are 2048"):
        lines_of(system(("1H", 11, -2.3)), "exact")


def test_large_groups_take_little_time() -> None:
    one = system(("1H", 12, 0.65), ("1H", 4, 0.2), ("14N", 2, 0.7))
    times = []
    for _ in range(3):
        start = time.process_time()
        lines = lines_of(one)
        draw(lines, Width(0.1), Shape(0.1), 1.0)
        times.append(time.process_time() - start)
    assert min(times) < 0.2
    assert len(lines_of(one, "first")) == 13 * 5 * 5


def test_tens_of_thousands_of_lines_are_no_burden() -> None:
    one = system(*(("1H", 1, 0.1 + 0.013 * k * k) for k in range(16)))
    start = time.process_time()
    lines = lines_of(one)
    draw(lines, Width(0.02), Shape(0.02), 1.0)
    assert time.process_time() - start < 2.0
    assert len(lines) == 2**16


def test_more_lines_than_can_be_named_are_joined_and_that_is_said() -> None:
    one = system(*(("1H", 1, 0.05 + 0.013 * k * k) for k in range(20)))
    lines = lines_of(one, "first")
    first_moment = lines.intensity @ (lines.position - lines.sweep.centre)
    second_moment = lines.intensity @ (lines.position - lines.sweep.centre) ** 2
    assert lines.twice_m is None
    assert "too many lines" in " ".join(lines.notes)
    assert first_moment == pytest.approx(0.0, abs=1e-9)
    scale = 2.00231930436092 / 2.0
    expected = sum((0.05 + 0.013 * k * k) ** 2 for k in range(20)) * scale**2 / 4  # variances add
    assert second_moment == pytest.approx(expected, rel=1e-6)
    assert lines.intensity.sum() == pytest.approx(1.0, abs=1e-12)


def test_joined_lines_keep_weight_and_centre() -> None:
    position, intensity = joined_lines(np.array([1.01, 1.02, 1.51]), np.array([1.0, 3.0, 2.0]), 0.5)
    assert position == pytest.approx([1.0175, 1.51])
    assert intensity == pytest.approx([4.0, 2.0])


def test_weights_share_out_the_intensity() -> None:
    parts = [(system(("1H", 1, 1.0), radical="one"), 3.0), (system(("14N", 1, 1.0), radical="two"), 1.0)]
    lines = line_list(parts, frequency_MHz=9500.0, width_mT=0.1)
    assert lines.intensity[lines.system == 0].sum() == pytest.approx(0.75)
    assert lines.groups == ("H1", "N1")


def test_columns_of_the_line_list() -> None:
    rows = list(
        csv.DictReader(io.StringIO(lines_csv(lines_of(system(("13C", 1, 3.8), ("1H", 3, -2.3)), "first"))))
    )
    assert list(rows[0]) == ["field_mT", "intensity", "m_I_C1", "m_I_H2"]
    assert len(rows) == 8
    assert {row["m_I_H2"] for row in rows} == {"-1.5", "-0.5", "0.5", "1.5"}
    assert sum(float(row["intensity"]) for row in rows) == pytest.approx(1.0)


def test_a_swept_frequency_has_its_own_column() -> None:
    lines = line_list([(system(("1H", 1, 1.0)), 1.0)], field_mT=340.0, width_mT=0.1)
    assert lines_csv(lines).startswith("frequency_MHz,intensity,m_I_H1\n")
    assert len(lines) == 2


def test_a_higher_spin_is_refused() -> None:
    with pytest.raises(InputError, match="S = 1: its spectrum needs zero-field splitting"):
        lines_of(replace(system(("17O", 2, 1.0)), electron_spin=1.0))


def test_an_unknown_order_names_the_known_ones() -> None:
    with pytest.raises(ChoiceError, match='did you mean "second"'):
        lines_of(NAPHTHALENE, "secnod")


def test_a_frequency_below_the_splitting_finds_the_lines_that_there_are() -> None:
    # The hydrogen atom at low field: three neighbouring sublevels of F = 1, g_F = g/2 (vector model, exact limit).
    lines = line_list([(system(("1H", 1, 50.0)), 1.0)], frequency_MHz=1.0, width_mT=0.001, order="exact")
    assert lines.position == pytest.approx([2 * lines.sweep.centre] * 2, rel=0.01)


@pytest.mark.parametrize("width", [0.0, -0.1, float("nan")])
def test_a_width_must_be_positive(width: float) -> None:
    with pytest.raises(InputError, match="width must be positive"):
        lines_of(NAPHTHALENE, width_mT=width)
