"""Spin projection against brute force in the full determinant space, and against its limits."""

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from unpaired.properties.corresponding import corresponding_orbitals
from unpaired.properties.projection import project, s_squared, s_squared_without_next_spin, spin_weights


def random_determinant(seed, functions, n_alpha, n_beta, mixing=1.0):
    """Occupied orbitals, orthonormal in a random metric; `mixing` 0 makes beta a subset of alpha."""
    draw = np.random.default_rng(seed)
    root = np.eye(functions) + 0.2 * draw.normal(size=(functions, functions))
    overlap = root.T @ root
    back = np.linalg.inv(root)
    alpha = np.linalg.qr(draw.normal(size=(functions, functions)))[0]
    generator = mixing * draw.normal(size=(functions, functions))
    values, vectors = np.linalg.eigh(1j * (generator - generator.T))
    turn = (vectors * np.exp(1j * values)) @ vectors.conj().T
    beta = alpha @ turn.real
    return back @ alpha[:, :n_alpha], back @ beta[:, :n_beta], overlap, root


def determinant_vector(alpha, beta):
    """Coefficients of a determinant in all determinants of an orthonormal basis, PySCF's string order."""
    from pyscf.fci import cistring

    functions = len(alpha)

    def minors(occupied):
        count = occupied.shape[1]
        strings = [
            [place for place in range(functions) if string >> place & 1]
            for string in cistring.make_strings(range(functions), count)
        ]
        return np.array([np.linalg.det(occupied[rows]) for rows in strings])

    return np.outer(minors(alpha), minors(beta))


def brute_force(alpha, beta):
    """Weights of all spins, and the spin density matrix of the lowest, by projectors over S^2."""
    from pyscf import fci

    functions, electrons = len(alpha), (alpha.shape[1], beta.shape[1])
    spin = (electrons[0] - electrons[1]) / 2
    vector = determinant_vector(alpha, beta)
    spins = [spin + step for step in range(electrons[1] + 1)]

    def part(wanted):
        found = vector
        for other in spins:
            if other != wanted:
                square = fci.spin_op.contract_ss(found, functions, electrons).reshape(vector.shape)
                found = (square - other * (other + 1) * found) / (wanted * (wanted + 1) - other * (other + 1))
        return found

    parts = [part(wanted) for wanted in spins]
    lowest = parts[0] / np.linalg.norm(parts[0])
    density_a, density_b = fci.direct_spin1.make_rdm1s(lowest, functions, electrons)
    return np.array([np.sum(one**2) for one in parts]), density_a - density_b, vector


CASES = [(5, 3, 2), (6, 4, 2), (6, 4, 1), (7, 5, 4)]  # doublet, triplet, quartet, doublet with four pairs


@pytest.mark.parametrize(("functions", "n_alpha", "n_beta"), CASES)
@pytest.mark.parametrize("mixing", [0.05, 0.4])
def test_projection_equals_brute_force(functions, n_alpha, n_beta, mixing):
    """Source: projector over all spins in the full determinant space, PySCF's FCI tools; 1e-10."""
    alpha, beta, overlap, root = random_determinant(7, functions, n_alpha, n_beta, mixing)
    weights, density, _ = brute_force(root @ alpha, root @ beta)
    pairs = corresponding_orbitals(alpha, beta, overlap)
    projected = project(pairs)
    assert root @ projected.spin_density_matrix @ root.T == pytest.approx(density, abs=1e-10)
    assert projected.pure_spin_weight == pytest.approx(weights[0], abs=1e-10)
    assert spin_weights(pairs) == pytest.approx(weights, abs=1e-10)


@pytest.mark.parametrize(("functions", "n_alpha", "n_beta"), CASES)
def test_removing_the_next_spin_equals_brute_force(functions, n_alpha, n_beta):
    """<A S^2 A>/<A A> by repeated application of S^2 to the vector of the determinant."""
    from pyscf import fci

    alpha, beta, overlap, root = random_determinant(3, functions, n_alpha, n_beta, 0.3)
    vector = determinant_vector(root @ alpha, root @ beta)
    electrons = (n_alpha, n_beta)
    spin = (n_alpha - n_beta) / 2

    def square(one):
        return fci.spin_op.contract_ss(one, functions, electrons).reshape(vector.shape)

    without = square(vector) - (spin + 1) * (spin + 2) * vector
    expected = np.vdot(without, square(without)) / np.vdot(without, without)
    pairs = corresponding_orbitals(alpha, beta, overlap)
    assert s_squared_without_next_spin(pairs) == pytest.approx(expected, abs=1e-10)
    assert s_squared(pairs) == pytest.approx(np.vdot(vector, square(vector)), abs=1e-10)


@pytest.mark.parametrize(("multiplicity", "n_alpha", "n_beta"), [(2, 4, 3), (3, 4, 2), (4, 4, 1)])
def test_small_polarisation_is_scaled_by_the_first_order_rule(multiplicity, n_alpha, n_beta):
    """First order: direct part kept, polarisation times S/(S+1); what is left over falls as the square."""
    spin = (multiplicity - 1) / 2
    left_over = []
    for mixing in (2e-3, 1e-3):
        alpha, beta, overlap, _ = random_determinant(11, 7, n_alpha, n_beta, mixing)
        pairs = corresponding_orbitals(alpha, beta, overlap)
        direct = pairs.unmatched @ pairs.unmatched.T
        polarisation = pairs.alpha @ pairs.alpha.T - pairs.beta @ pairs.beta.T
        ruled = direct + spin / (spin + 1) * polarisation
        rest = np.abs(project(pairs).spin_density_matrix - ruled).max()
        assert rest < 0.05 * np.abs(polarisation).max()
        left_over.append(rest)
    assert left_over[0] / left_over[1] == pytest.approx(4, rel=0.05)


@settings(max_examples=30, deadline=None)
@given(seed=st.integers(0, 10**6), n_beta=st.integers(0, 4), twice=st.integers(1, 3), mixing=st.floats(0, 1))
def test_laws_of_projection(seed, n_beta, twice, mixing):
    """The trace is 2S, weights sum to 1, and the weights give back <S^2>."""
    alpha, beta, overlap, _ = random_determinant(seed, 9, n_beta + twice, n_beta, mixing)
    pairs = corresponding_orbitals(alpha, beta, overlap)
    projected, weights = project(pairs), spin_weights(pairs)
    assert np.sum(projected.spin_density_matrix * overlap) == pytest.approx(twice, abs=1e-9)
    assert weights.sum() == pytest.approx(1, abs=1e-10)
    spins = twice / 2 + np.arange(len(weights))
    assert weights @ (spins * (spins + 1)) == pytest.approx(s_squared(pairs), abs=1e-9)
    assert weights.min() > -1e-12


def test_a_pure_determinant_is_left_alone():
    alpha, _, overlap, _ = random_determinant(5, 6, 4, 3)
    pairs = corresponding_orbitals(alpha, alpha[:, :3], overlap)
    projected = project(pairs)
    assert projected.spin_density_matrix == pytest.approx(np.outer(alpha[:, 3], alpha[:, 3]), abs=1e-12)
    assert projected.pure_spin_weight == pytest.approx(1, abs=1e-12)
    assert s_squared_without_next_spin(pairs) == pytest.approx(0.75, abs=1e-12)


def test_forty_pairs_lose_no_digits():
    """Many weakly polarised pairs, as in a large molecule: weights sum to 1 and give back <S^2>."""
    alpha, beta, overlap, _ = random_determinant(1, 90, 41, 40, 0.01)
    pairs = corresponding_orbitals(alpha, beta, overlap)
    weights = spin_weights(pairs)
    spins = 0.5 + np.arange(len(weights))
    assert weights.sum() == pytest.approx(1, abs=1e-12)
    assert weights @ (spins * (spins + 1)) == pytest.approx(s_squared(pairs), abs=1e-9)
    lowest, low = spins[:12], weights[:12]  # the others weigh less than 1e-15: rounding, times s^6
    changed = low * (lowest * (lowest + 1) - 3.75) ** 2
    moment = changed @ (lowest * (lowest + 1)) / changed.sum()
    assert s_squared_without_next_spin(pairs) == pytest.approx(moment, rel=1e-8)


def test_the_sign_of_orbitals_does_not_matter():
    alpha, beta, overlap, _ = random_determinant(2, 6, 3, 2)
    reference = project(corresponding_orbitals(alpha, beta, overlap)).spin_density_matrix
    for signs in itertools.product((1, -1), repeat=2):
        flipped = beta * np.array(signs)
        found = project(corresponding_orbitals(alpha, flipped, overlap)).spin_density_matrix
        assert found == pytest.approx(reference, abs=1e-11)
