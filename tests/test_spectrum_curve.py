"""Shapes and curves against calculus and brute force."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad
from spin_samples import system

from unpaired.errors import InputError
from unpaired.spectrum.curve import Curve, Width, curve_csv, draw, with_noise
from unpaired.spectrum.lines import Lines, line_list
from unpaired.spectrum.shapes import Shape, gaussian, line, lorentzian

SHAPES = (gaussian, lorentzian)
X = np.linspace(-3.0, 3.0, 601)


@pytest.mark.parametrize("shape", SHAPES)
def test_absorption_has_unit_area(shape: object) -> None:
    area = quad(lambda x: float(shape(np.array([x]), 0.3, 0)[0]), -np.inf, np.inf)[0]  # type: ignore[operator]
    assert area == pytest.approx(1.0, abs=1e-8)


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("derivative", [1, 2])
def test_derivatives_are_those_of_the_absorption(shape: object, derivative: int) -> None:
    step = 1e-5
    numeric = (shape(X + step, 0.7, derivative - 1) - shape(X - step, 0.7, derivative - 1)) / (2 * step)  # type: ignore[operator]
    assert shape(X, 0.7, derivative) == pytest.approx(numeric, abs=1e-7)  # type: ignore[operator]


@pytest.mark.parametrize("shape", SHAPES)
def test_the_width_is_the_distance_between_the_extrema_of_the_derivative(shape: object) -> None:
    fine = np.linspace(-1.0, 1.0, 200_001)
    signal = shape(fine, 0.3, 1)  # type: ignore[operator]
    assert fine[signal.argmin()] - fine[signal.argmax()] == pytest.approx(0.3, abs=2e-5)


@pytest.mark.parametrize("share", [0.0, 0.3, 1.0])
@pytest.mark.parametrize("amplitude", [0.05, 0.4, 3.0])
def test_modulation_is_the_first_harmonic_of_the_modulated_absorption(share: float, amplitude: float) -> None:
    shape = Shape(0.3, share, 1, amplitude)
    angle = (np.arange(4000) + 0.5) * 2 * np.pi / 4000

    def harmonic(x: float) -> float:
        swung = line(x + amplitude / 2 * np.sin(angle), Shape(0.3, share, 0))
        return float(2 * np.mean(swung * np.sin(angle)) / (amplitude / 2))

    expected = [harmonic(x) for x in X[::40]]
    assert line(X[::40], shape) == pytest.approx(expected, abs=1e-6)


def test_modulation_of_the_second_derivative_is_the_second_harmonic() -> None:
    amplitude = 0.5
    angle = (np.arange(4000) + 0.5) * 2 * np.pi / 4000
    expected = [
        # cos 2t of f(x + r cos t) is f'' r^2 / 4 for small r
        2
        * np.mean(line(x + amplitude / 2 * np.cos(angle), Shape(0.3, 0.5, 0)) * np.cos(2 * angle))
        / ((amplitude / 2) ** 2 / 4)
        for x in X[::40]
    ]
    assert line(X[::40], Shape(0.3, 0.5, 2, amplitude)) == pytest.approx(expected, abs=1e-5)


def some_lines(width_mT: float = 0.1) -> Lines:
    one = system(("1H", 3, -2.3), ("13C", 1, 3.8), ("14N", 1, 0.51))
    return line_list([(one, 1.0)], frequency_MHz=9500.0, width_mT=width_mT)


def brute_force(lines: Lines, curve: Curve, shape: Shape) -> np.ndarray:
    return sum(
        w * line(curve.position - b, shape) for b, w in zip(lines.position, lines.intensity, strict=True)
    )


@pytest.mark.parametrize("share", [0.0, 0.5, 1.0])
@pytest.mark.parametrize("derivative", [0, 1, 2])
def test_the_curve_is_the_sum_of_its_lines(share: float, derivative: int) -> None:
    lines, shape = some_lines(), Shape(0.1, share, derivative)
    curve = draw(lines, Width(0.1), shape, 1.0)
    assert curve.signal == pytest.approx(
        brute_force(lines, curve, shape), abs=1e-4 * np.abs(curve.signal).max()
    )


def test_few_points_are_points_of_the_same_curve() -> None:
    lines, shape = some_lines(), Shape(0.1)
    curve = draw(lines, Width(0.1), shape, 1.0, points=50)
    assert len(curve.position) == 50
    assert curve.signal == pytest.approx(
        brute_force(lines, curve, shape), abs=1e-4 * curve.signal.max() + 1e-3
    )


def test_a_narrow_range_keeps_the_wings_of_lines_outside() -> None:
    lines, shape = some_lines(), Shape(0.1, 1.0)
    middle = float(lines.position[len(lines) // 2])
    curve = draw(lines, Width(0.1), shape, 1.0, (middle - 0.2, middle + 0.2))
    assert curve.signal == pytest.approx(
        brute_force(lines, curve, shape), abs=1e-4 * np.abs(curve.signal).max()
    )


@settings(deadline=None, max_examples=10)
@given(st.floats(0.02, 1.0), st.floats(0.0, 0.3))
def test_double_integral_is_the_summed_intensity(width_mT: float, modulation_mT: float) -> None:
    lines = some_lines()
    shape = Shape(width_mT, 0.0, 1, modulation_mT)
    low, high = lines.position[0] - 6 * width_mT - 0.3, lines.position[-1] + 6 * width_mT + 0.3
    curve = draw(lines, Width(width_mT), shape, 1.0, (low, high))
    step = curve.position[1] - curve.position[0]
    once = np.cumsum(curve.signal) * step
    assert once.sum() * step == pytest.approx(1.0, abs=1e-6)


def test_widths_may_depend_on_m() -> None:
    lines = line_list([(system(("14N", 1, 1.5)), 1.0)], frequency_MHz=9500.0, width_mT=0.1, order="first")
    curve = draw(lines, Width(0.1, 0.02, 0.01, "N1"), Shape(0.1), 1.0)
    expected = np.zeros_like(curve.position)
    for field, twice_m in zip(lines.position, lines.twice_m[:, 0], strict=True):  # type: ignore[index]
        m = twice_m / 2
        expected += line(curve.position - field, Shape(0.1 + 0.02 * m + 0.01 * m * m)) / 3
    assert curve.signal == pytest.approx(expected, abs=1e-4 * curve.signal.max())


def test_noise_comes_from_its_seed() -> None:
    curve = draw(some_lines(), Width(0.1), Shape(0.1), 1.0)
    noisy = with_noise(curve, 0.02, seed=5)
    assert np.array_equal(noisy.signal, with_noise(curve, 0.02, seed=5).signal)
    assert not np.array_equal(noisy.signal, with_noise(curve, 0.02, seed=6).signal)
    assert np.std(noisy.signal - curve.signal) == pytest.approx(0.02 * np.abs(curve.signal).max(), rel=0.05)


def test_columns_of_the_curve() -> None:
    text = curve_csv(draw(some_lines(), Width(0.1), Shape(0.1), 1.0, points=11))
    assert text.splitlines()[0] == "field_mT,signal"
    assert len(text.splitlines()) == 12


@pytest.mark.parametrize(
    ("width", "words"),
    [
        (Width(0.1, 0.2, 0.0, "N5"), r"is -0.1 mT at m = -1 of N5: it must be positive for every line"),
        (
            Width(0.1, 0.0, 0.0, "N9"),
            r'group "N9" of the width is not in the line list .there are H1, C4, N5',
        ),
    ],
)
def test_a_width_that_cannot_be_is_refused(width: Width, words: str) -> None:
    with pytest.raises(InputError, match=words):
        draw(some_lines(), width, Shape(0.1), 1.0)


def test_a_range_that_misses_every_line_says_where_they_are() -> None:
    with pytest.raises(
        InputError, match=r"no line lies between 100 and 120 mT; the lines lie from 33\d\.\d{4} to"
    ):
        draw(some_lines(), Width(0.1), Shape(0.1), 1.0, (100.0, 120.0))


@pytest.mark.parametrize("points", [1, 0, 10**9])
def test_a_number_of_points_that_cannot_be_is_refused(points: int) -> None:
    with pytest.raises(InputError, match=f"a curve has 2 to 2000000 points, found {points}"):
        draw(some_lines(), Width(0.1), Shape(0.1), 1.0, points=points)


def test_a_negative_seed_is_refused() -> None:
    curve = draw(some_lines(), Width(0.1), Shape(0.1), 1.0)
    with pytest.raises(InputError, match="the seed of the noise cannot be negative, found -1"):
        with_noise(curve, 0.1, seed=-1)


def test_a_falling_range_is_refused() -> None:
    with pytest.raises(InputError, match="the range must rise"):
        draw(some_lines(), Width(0.1), Shape(0.1), 1.0, (350.0, 330.0))


def test_a_curve_too_long_for_memory_is_refused() -> None:
    with pytest.raises(InputError, match="needs more than 2000000 points; narrow the range"):
        draw(some_lines(), Width(1e-7), Shape(1e-7), 1.0)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((0.0,), "width must be positive"),
        ((float("nan"),), "width must be positive"),
        ((0.1, 1.5), "share lies between 0 and 1"),
        ((0.1, 0.0, 3), "derivative is 0, 1 or 2"),
        ((0.1, 0.0, 1, -1.0), "modulation cannot be negative"),
        ((0.1, 0.0, 0, 0.1), "modulation belongs to a derivative"),
    ],
)
def test_shapes_that_cannot_be_are_refused(arguments: tuple[float, ...], words: str) -> None:
    with pytest.raises(InputError, match=words):
        Shape(*arguments)  # type: ignore[arg-type]
