"""Lanczos searches: lowest states, degenerate copies, little memory, restarts, stopping."""

from __future__ import annotations

import numpy as np
import pytest

from thalweg.errors import Stopped
from thalweg.exact import lanczos
from thalweg.exact.lanczos import dense_levels, lowest_state, random_start, rayleigh
from thalweg.watch import SILENT, Watch


def symmetric(levels: np.ndarray, seed: int = 1, complex_: bool = False) -> np.ndarray:
    """A matrix with these eigenvalues in random directions."""
    rng = np.random.default_rng(seed)
    full = rng.normal(size=(levels.size,) * 2) + (1j * rng.normal(size=(levels.size,) * 2) if complex_ else 0.0)
    turn, _ = np.linalg.qr(full)
    return turn @ np.diag(levels) @ turn.conj().T


def action(matrix: np.ndarray):
    def apply(vector, out):
        out[:] = matrix @ vector

    return apply


def within(tolerance: float):
    return lambda energy, residual: residual <= tolerance


SPECTRUM = np.sort(np.random.default_rng(7).normal(size=300))


@pytest.mark.parametrize("complex_", [False, True])
def test_the_lowest_state_solves_the_eigenvalue_equation(complex_):
    matrix = symmetric(SPECTRUM, complex_=complex_)
    level = lowest_state(action(matrix), random_start(300, matrix.dtype, 1), is_enough=within(1e-10), watch=SILENT)
    assert level.converged
    assert level.energy == pytest.approx(SPECTRUM[0], abs=1e-10)
    assert np.linalg.norm(level.vector) == pytest.approx(1.0)
    assert level.residual == pytest.approx(np.linalg.norm(matrix @ level.vector - level.energy * level.vector), abs=1e-12)
    assert level.residual <= 1e-10


def test_each_copy_of_a_degenerate_level_is_found():
    levels = np.concatenate([[-2.0, -2.0, -2.0], np.linspace(-1.5, 1.0, 197)])
    matrix, found = symmetric(levels), []
    for k in range(5):
        start = random_start(200, float, k + 1)
        found.append(lowest_state(action(matrix), start, is_enough=within(1e-9), watch=SILENT, found=[f.vector for f in found]))
    assert [f.energy for f in found] == pytest.approx(levels[:5], abs=1e-9)
    overlaps = np.array([[a.vector @ b.vector for b in found] for a in found])
    assert np.allclose(overlaps, np.eye(5), atol=1e-9)


@pytest.mark.parametrize("room", [2, 5, 20])
def test_little_room_costs_steps_but_gives_the_same_state(room):
    matrix = symmetric(SPECTRUM)
    start = random_start(300, float, 1)
    wide = lowest_state(action(matrix), start, is_enough=within(1e-9), watch=SILENT)
    narrow = lowest_state(action(matrix), start, is_enough=within(1e-9), watch=SILENT, room=room)
    assert narrow.energy == pytest.approx(wide.energy, abs=1e-10)
    assert abs(narrow.vector @ wide.vector) == pytest.approx(1.0, abs=1e-10)
    assert narrow.steps > wide.steps


def test_short_chains_restart_until_converged(monkeypatch):
    monkeypatch.setattr(lanczos, "CHAIN_STEPS", 12)
    matrix = symmetric(np.concatenate([[-3.0], np.linspace(-1.0, 1.0, 199)]))
    level = lowest_state(action(matrix), random_start(200, float, 1), is_enough=within(1e-9), watch=SILENT)
    assert level.converged
    assert level.energy == pytest.approx(-3.0, abs=1e-9)
    assert level.steps > 13


def test_a_search_that_does_not_converge_says_so(monkeypatch):
    monkeypatch.setattr(lanczos, "CHAIN_STEPS", 4)
    monkeypatch.setattr(lanczos, "RESTARTS", 1)
    level = lowest_state(action(symmetric(SPECTRUM)), random_start(300, float, 1), is_enough=within(1e-10), watch=SILENT)
    assert not level.converged
    assert level.residual > 1e-10


def test_an_invariant_start_ends_at_once():
    matrix = np.diag([3.0, 1.0, 2.0])
    level = lowest_state(action(matrix), np.array([0.0, 0.0, 5.0]), is_enough=within(1e-12), watch=SILENT)
    assert level.energy == 2.0
    assert level.residual == 0.0


def test_one_state_is_a_problem_too():
    level = lowest_state(action(np.array([[4.0]])), np.ones(1), is_enough=within(1e-12), watch=SILENT)
    assert level.energy == 4.0


@pytest.mark.parametrize("complex_", [False, True])
def test_small_matrices_are_diagonalised_whole(complex_):
    matrix = symmetric(SPECTRUM[:40], complex_=complex_)
    levels = dense_levels(action(matrix), 40, matrix.dtype, SILENT)
    assert [level.energy for level in levels] == pytest.approx(SPECTRUM[:40])
    assert max(level.residual for level in levels) < 1e-12


def test_the_rayleigh_quotient_leaves_out_what_was_found():
    matrix = symmetric(SPECTRUM[:30])
    _, vectors = np.linalg.eigh(matrix)
    energy, residual = rayleigh(action(matrix), vectors[:, 3].copy())
    assert energy == pytest.approx(SPECTRUM[3])
    assert residual < 1e-12
    mixed = (vectors[:, 0] + vectors[:, 1]) / np.sqrt(2)
    assert rayleigh(action(matrix), mixed)[1] == pytest.approx((SPECTRUM[1] - SPECTRUM[0]) / 2)


def test_starts_repeat_with_their_seed():
    assert np.array_equal(random_start(50, complex, 3), random_start(50, complex, 3))
    assert not np.allclose(random_start(50, float, 3), random_start(50, float, 4))


def test_a_search_stops_when_asked_to():
    looks = iter([False] * 10 + [True] * 100)
    with pytest.raises(Stopped):
        lowest_state(action(symmetric(SPECTRUM)), random_start(300, float, 1), is_enough=within(0.0), watch=Watch(should_stop=lambda: next(looks)))
