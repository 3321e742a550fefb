"""Exact line positions against spin Hamiltonians built and diagonalised with QuTiP, a general-purpose library."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
import qutip
from scipy import constants
from scipy.optimize import brentq
from spin_samples import splitting

from unpaired.constants import ELECTRON_G
from unpaired.nuclei import isotope
from unpaired.spectrum.exact import exact_lines
from unpaired.spectrum.splitting import Sweep

FREQUENCY_MHz = 9500.0
# SciPy's constants, not ours.
BOHR_MHz_mT = constants.value("Bohr magneton in Hz/T") * 1e-9
NUCLEAR_MHz_mT = constants.value("nuclear magneton in MHz/T") * 1e-3

SYSTEMS = [
    [("1H", 1420.4)],
    [("14N", 45.0), ("1H", -62.0)],
    [("13C", 107.0), ("1H", -64.6), ("1H", -31.0)],
    [("13C", -30.0), ("14N", 30.0), ("1H", 30.0)],
    [("1H", 40.0), ("1H", 40.2), ("14N", 12.0)],
]


def hamiltonian(nuclei: list[tuple[str, float]]) -> tuple[qutip.Qobj, qutip.Qobj, qutip.Qobj]:
    """H(B) = first + B * second in MHz and mT, and S_x."""
    spins = [0.5, *(isotope(name).spin for name, _ in nuclei)]

    def operator(which: int, axis: str) -> qutip.Qobj:
        return qutip.tensor(
            *(
                qutip.jmat(spin, axis) if place == which else qutip.qeye(round(2 * spin + 1))
                for place, spin in enumerate(spins)
            )
        )

    hyperfine = sum(
        a * operator(0, axis) * operator(place, axis)
        for place, (_, a) in enumerate(nuclei, start=1)
        for axis in "xyz"
    )
    zeeman = ELECTRON_G * BOHR_MHz_mT * operator(0, "z") - sum(
        isotope(name).nuclear_g * NUCLEAR_MHz_mT * operator(place, "z")
        for place, (name, _) in enumerate(nuclei, start=1)
    )
    return hyperfine, zeeman, operator(0, "x")


def fields_by_root_search(nuclei: list[tuple[str, float]]) -> list[float]:
    """Every field between 280 and 400 mT at which a pair of levels joined by S_x is 9500 MHz apart."""
    hyperfine, zeeman, flip = hamiltonian(nuclei)

    def gap(field: float, i: int, j: int) -> float:
        energy = (hyperfine + field * zeeman).eigenenergies()
        return float(energy[j] - energy[i]) - FREQUENCY_MHz

    grid = np.linspace(280.0, 400.0, 241)
    energies, strengths = [], []
    for field in grid:
        values, vectors = (hyperfine + field * zeeman).eigenstates()
        matrix = np.hstack([vector.full() for vector in vectors])
        energies.append(values)
        strengths.append(np.abs(matrix.conj().T @ flip.full() @ matrix) ** 2)
    found = []
    for place, (low, high) in enumerate(pairwise(grid)):
        difference = [energies[k][None, :] - energies[k][:, None] - FREQUENCY_MHz for k in (place, place + 1)]
        for i, j in np.argwhere((difference[0] < 0) & (difference[1] >= 0)):
            if max(strengths[place][i, j], strengths[place + 1][i, j]) > 0.02:
                found.append(brentq(gap, low, high, args=(i, j), xtol=1e-11))
    return sorted(found)


@pytest.mark.parametrize("nuclei", SYSTEMS, ids=lambda nuclei: "+".join(name for name, _ in nuclei))
def test_fields_are_those_of_qutip(nuclei: list[tuple[str, float]]) -> None:
    position, weight, _ = exact_lines(
        [splitting(name, 1, a) for name, a in nuclei], Sweep(ELECTRON_G, frequency_MHz=FREQUENCY_MHz)
    )
    expected = fields_by_root_search(nuclei)
    strong = weight > 0.05 * weight.max()
    assert np.sort(position[strong]).tolist() == pytest.approx(expected, abs=1e-6)


def test_a_group_of_equivalent_nuclei_is_that_of_qutip() -> None:
    methyl = [("1H", -64.6)] * 3
    position, weight, _ = exact_lines(
        [splitting("1H", 3, -64.6)], Sweep(ELECTRON_G, frequency_MHz=FREQUENCY_MHz)
    )
    expected = sorted(set(np.round(fields_by_root_search(methyl), 7)))
    assert np.sort(position).tolist() == pytest.approx(expected, abs=1e-6)
    assert weight.sum() == pytest.approx(1.0, abs=1e-12)


def test_intensities_are_those_of_qutip() -> None:
    nuclei = [("1H", 900.0), ("14N", 200.0)]  # large, so that intensities differ
    position, weight, _ = exact_lines(
        [splitting(name, 1, a) for name, a in nuclei], Sweep(ELECTRON_G, frequency_MHz=FREQUENCY_MHz)
    )
    hyperfine, zeeman, flip = hamiltonian(nuclei)
    areas = []
    for field in fields_by_root_search(nuclei):
        values, vectors = (hyperfine + field * zeeman).eigenstates()
        matrix = np.hstack([vector.full() for vector in vectors])
        strength = np.abs(matrix.conj().T @ flip.full() @ matrix) ** 2
        i, j = np.unravel_index(
            np.abs(values[None, :] - values[:, None] - FREQUENCY_MHz).argmin(), strength.shape
        )
        slope = (vectors[j].dag() * zeeman * vectors[j] - vectors[i].dag() * zeeman * vectors[i]).real
        areas.append(strength[i, j] / slope)  # area of a line in a field sweep
    strong = np.argsort(position)[np.sort(weight)[-len(areas)] <= weight[np.argsort(position)]]
    assert weight[strong] / weight[strong].sum() == pytest.approx(np.array(areas) / sum(areas), rel=1e-5)
