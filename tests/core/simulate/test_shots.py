"""Drawn bit strings have the distribution of the state, and their means and variances those of the Hamiltonian."""

import numpy as np
import pytest
from reference.measurement import HARTREE_FOCK_FIGURES
from scipy.stats import chi2
from support.dense import string_matrix
from support.molecules import computed_molecule, stored_molecule

from thalweg.cost.groups import qubit_wise_groups
from thalweg.encoding import BravyiKitaev, JordanWigner
from thalweg.encoding.encoded import encode_fermions
from thalweg.evaluate.allocation import best_figure, spread
from thalweg.operators.pauli import PauliExpansion, collect_terms
from thalweg.simulate.shots import MeasuredSets


def random_case(n: int, seed: int) -> tuple[PauliExpansion, np.ndarray]:
    rng = np.random.default_rng(seed)
    x, z = rng.integers(0, 1 << n, (2, 40)).astype(np.uint64)
    state = rng.normal(size=1 << n) + 1j * rng.normal(size=1 << n)
    return collect_terms(n, x, z, rng.normal(size=40)), state / np.linalg.norm(state)


def expectation(expansion: PauliExpansion, members: np.ndarray, state: np.ndarray) -> tuple[float, float]:
    """Mean and variance of a set of strings by dense matrices."""
    matrix = sum(expansion.coefficients[i] * string_matrix(expansion.n_qubits, int(expansion.x[i]), int(expansion.z[i])) for i in members)
    mean = np.vdot(state, matrix @ state).real
    return mean, np.vdot(state, matrix @ matrix @ state).real - mean**2


@pytest.mark.parametrize("basis", [(0, 0), (1, 0), (1, 1), (0b110, 0b010)])
def test_bit_strings_follow_the_probabilities_of_the_turned_state(basis):
    """Chi-squared over all outcomes, Z X and Y bases; the limit is passed by chance once in a million."""
    x, z = basis
    n, shots = 3, 40_000
    _, state = random_case(n, 4)
    expansion = PauliExpansion(n, np.array([x], np.uint64), np.array([z], np.uint64), np.ones(1))
    sets = MeasuredSets(expansion, (np.array([0]),))
    counts = sets.counts(state, 0, shots, np.random.default_rng(11))
    hadamard, phase = np.array([[1, 1], [1, -1]]) / 2**0.5, np.diag([1, -1j])
    turn = np.eye(1)
    for q in range(n):
        letter = (x >> q & 1) + 2 * (z >> q & 1)
        turn = np.kron({0: np.eye(2), 2: np.eye(2), 1: hadamard, 3: hadamard @ phase}[letter], turn)
    expected = shots * np.abs(turn @ state) ** 2
    assert counts.sum() == shots
    assert float(((counts - expected) ** 2 / expected).sum()) < chi2.isf(1e-6, counts.size - 1)


def test_an_eigenstate_gives_one_outcome_always():
    for x, z, state in ((1, 1, [1, 1j]), (1, 0, [1, -1]), (0, 1, [0, 1])):
        expansion = PauliExpansion(1, np.array([x], np.uint64), np.array([z], np.uint64), np.array([0.7]))
        sets = MeasuredSets(expansion, (np.array([0]),))
        amplitudes = np.array(state, complex) / np.linalg.norm(state)
        sums = sets.sample(amplitudes, np.array([500]), np.random.default_rng(1))
        value = 0.7 if x and z else -0.7
        assert sums[0] == pytest.approx([500 * value, 500 * value**2])


@pytest.mark.parametrize("n", [1, 2, 4])
def test_exact_means_and_variances_are_those_of_dense_matrices(n):
    expansion, state = random_case(n, n)
    groups = qubit_wise_groups(expansion)
    means, variances = MeasuredSets(expansion, groups).moments(state)
    expected = np.array([expectation(expansion, members, state) for members in groups])
    assert np.allclose(means, expected[:, 0], atol=1e-12)
    assert np.allclose(variances, expected[:, 1], atol=1e-12)


def test_sampled_means_lie_within_five_standard_errors_and_spread_as_foretold():
    expansion, state = random_case(4, 9)
    sets = MeasuredSets(expansion, qubit_wise_groups(expansion))
    means, variances = sets.moments(state)
    shots, rng = np.full(means.size, 2000), np.random.default_rng(5)
    sums = np.array([sets.sample(state, shots, rng) for _ in range(200)])
    found = sums[:, :, 0] / shots
    errors = np.sqrt(variances / shots)
    assert np.all(np.abs(found - means) < 5 * errors + 1e-12)
    varied = variances > 1e-12
    ratio = found.var(axis=0, ddof=1)[varied] / errors[varied] ** 2
    assert np.all(ratio < chi2.isf(1e-6, 199) / 199)
    assert np.all(ratio > chi2.isf(1 - 1e-6, 199) / 199)


def test_drawing_in_parts_takes_every_shot(monkeypatch):
    monkeypatch.setattr("thalweg.simulate.shots.PART", 7)
    expansion = PauliExpansion(1, np.array([0, 1], np.uint64), np.array([1, 0], np.uint64), np.ones(2))
    sums = MeasuredSets(expansion, (np.array([0]), np.array([1]))).sample(np.array([1.0, 0.0]), np.array([20, 13]), np.random.default_rng(1))
    assert sums[:, 1].tolist() == [20.0, 13.0]  # +-1 squared, once a shot
    assert sums[0, 0] == 20.0


def test_same_seed_same_numbers():
    expansion, state = random_case(3, 2)
    sets = MeasuredSets(expansion, qubit_wise_groups(expansion))
    shots = np.full(sets.weights.size, 50)
    one, other, third = (sets.sample(state, shots, np.random.default_rng(seed)) for seed in (3, 3, 4))
    assert np.array_equal(one, other)
    assert not np.array_equal(one, third)


@pytest.mark.parametrize("name", ["H2", "LiH"])
@pytest.mark.parametrize("settings", [JordanWigner(taper=False), BravyiKitaev(taper=False)], ids=["jordan-wigner", "bravyi-kitaev"])
def test_the_best_allocation_at_hartree_fock_has_the_published_figure(name, settings):
    hamiltonian = stored_molecule("H2_sto-3g_singlet_0.7414")[1] if name == "H2" else computed_molecule("LiH")
    encoded = encode_fermions(hamiltonian, settings)
    expansion = encoded.working
    terms = np.flatnonzero((expansion.x | expansion.z) != 0)
    state = np.zeros(1 << expansion.n_qubits)
    state[encoded.reference_bits] = 1.0
    sets = MeasuredSets(expansion, tuple(terms[:, None]))
    deviations = np.sqrt(sets.moments(state)[1])
    figure = HARTREE_FOCK_FIGURES[name]
    assert best_figure(deviations) == pytest.approx(figure, rel=1e-4)
    total = 10**6
    reached = float((deviations**2 / spread(total, deviations)).sum()) * total
    assert reached == pytest.approx(figure, rel=2e-3)
    assert float((deviations**2 / spread(total, np.ones_like(deviations))).sum()) * total > 1.2 * figure
