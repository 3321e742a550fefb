"""What `unpaired check` says about memory and time."""

import multiprocessing
from dataclasses import replace

import numpy as np
import pytest
from peak import peak_bytes

from unpaired.electronic import cost
from unpaired.electronic.meanfield import mean_field
from unpaired.electronic.mole import build_mole
from unpaired.electronic.settings import settings
from unpaired.electronic.sizes import sizes
from unpaired.level import Level
from unpaired.molecule import Molecule
from unpaired.point import Point

FORMYL = Molecule(("C", "O", "H"), np.array([[0, 0, 0], [0, 0, 2.22], [1.77, 0, -1.12]]), 0, 2)
CHAIN = Molecule(
    ("C", "H", "H", "C", "H", "C", "H", "H"),
    np.array([[0, 2.3, 0.4], [0, 4.1, -0.6], [0, 2.4, 2.45], [0, 0, -0.85], [0, 0, -2.9],
              [0, -2.3, 0.4], [0, -4.1, -0.6], [0, -2.4, 2.45]]),
    0,
    2,
)  # fmt: skip
"""Allyl, roughly."""


def test_counts_are_those_of_the_calculation():
    level = Level("UKS", "pcH-1", "B3LYP")
    point = Point(FORMYL, level)
    counted = sizes(point, settings(level))
    mole = build_mole(point)
    field = mean_field(mole, level, None, settings(level))
    field.grids.build()
    assert counted.functions == mole.nao
    assert counted.electrons == mole.nelectron
    assert (counted.fitting, counted.pairs) == field.with_df.integrals().packed.shape
    # the library pads the number of points to a multiple of 448
    assert 0 <= field.grids.weights.size - counted.points < 448


def test_share_of_functions_on_the_grid_is_near_the_truth():
    level = Level("UKS", "pcH-1", "B3LYP")
    point = Point(CHAIN, level)
    mole = build_mole(point)
    field = mean_field(mole, level, None, settings(level))
    blocks = field._numint.blocks(mole, field.grids, "GGA").blocks
    true = sum(b.functions.size * (b.stop - b.start) for b in blocks) / (mole.nao * blocks[-1].stop)
    assert sizes(point, settings(level)).share == pytest.approx(true, rel=0.2)


@pytest.mark.parametrize("accuracy", ["quick", "standard", "reference"])
def test_a_larger_basis_costs_more(accuracy):
    small, large = (
        cost.estimate(Point(CHAIN, Level("UKS", basis, "B3LYP", accuracy=accuracy)))
        for basis in ("pcH-1", "pcH-2")
    )
    assert large.basis_functions > small.basis_functions
    assert large.memory_bytes > small.memory_bytes
    assert large.seconds > small.seconds


def peak(point: Point, answer: "multiprocessing.Queue[int]") -> None:
    from unpaired.electronic.solve import solve

    solve(point)
    answer.put(peak_bytes())


@pytest.mark.slow
@pytest.mark.parametrize(
    ("scf", "functional", "accuracy"),
    [("UHF", None, "standard"), ("UKS", "B3LYP", "standard"), ("UKS", "B3LYP", "quick")],
)
def test_memory_stays_under_the_estimate(scf, functional, accuracy):
    """And the estimate is no more than 1.6 times what is used: most of a small radical is the program itself."""
    point = Point(CHAIN, Level(scf, "pcH-1", functional, accuracy=accuracy))
    context = multiprocessing.get_context("spawn")
    answer = context.Queue()
    process = context.Process(target=peak, args=(point, answer))
    process.start()
    used = answer.get(timeout=600)
    process.join()
    assert used <= cost.estimate(point).memory_bytes <= 1.6 * used


def test_accuracies_cost_differently():
    point = Point(CHAIN, Level("UKS", "pcH-1", "B3LYP"))
    times = [
        cost.estimate(replace(point, level=replace(point.level, accuracy=name))).seconds
        for name in ("quick", "standard", "reference")
    ]
    assert times == sorted(times)
