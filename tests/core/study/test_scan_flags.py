"""Flags fall on what was built in, and on nothing else."""

import numpy as np
import pytest

from thalweg.study.scan_flags import extremum_of_second_derivative, jumps, level_crossings, spin_crossings

X = [0.1 * i for i in range(20)]
SMOOTH = [1e-5 * (1 + 0.2 * i + 0.03 * i * i) for i in range(20)]


def test_a_smooth_error_curve_has_no_jump():
    assert jumps(X, SMOOTH, 1e-6) == ()


@pytest.mark.parametrize("place", [0, 1, 9, 18, 19])
def test_a_single_high_point_is_found(place):
    values = list(SMOOTH)
    values[place] += 3e-3
    assert jumps(X, values, 1e-4) == (place,)


def test_a_step_to_another_branch_is_found_at_its_first_high_point():
    values = [v + (2e-3 if i >= 12 else 0) for i, v in enumerate(SMOOTH)]
    assert jumps(X, values, 1e-4) == (12,)


def test_a_steep_but_smooth_rise_is_not_a_jump():
    assert jumps(X[:12], [1e-3 * 1.6**i for i in range(12)], 1e-4) == ()


def test_missing_points_do_not_hide_a_jump():
    values = list(SMOOTH)
    values[5], values[6] = None, values[6] + 4e-3
    assert jumps(X, values, 1e-4) == (6,)


def test_a_change_of_spin_is_located():
    (crossing,) = spin_crossings([1.0, 1.1, 1.2, 1.3], [0.0, 0.0, 2.0, 2.0])
    assert (crossing.left, crossing.right) == (1.1, 1.2)
    assert "S^2 = 0.00 at 1.1 to 2.00 at 1.2" in crossing.sentence()


def test_the_transition_of_the_transverse_ising_ring_shows_in_the_second_derivative():
    # Pfeuty 1970: E = -sum_k sqrt(1 + h^2 - 2 h cos k), k = (2m+1) pi/N; the transition is at h = 1.
    n = 200
    k = (2 * np.arange(n) + 1) * np.pi / n
    fields = np.linspace(0.5, 1.5, 41)
    energies = [-np.sqrt(1 + h * h - 2 * h * np.cos(k)).sum() for h in fields]
    assert extremum_of_second_derivative(fields, energies) == pytest.approx(1.0, abs=0.026)


def test_uneven_points_of_a_smooth_curve_do_not_jump():
    # A scan that was refined around its minimum, and one that was stopped with whole blocks missing.
    x = np.array([0.6, 0.8, 1.0, 1.1, 1.15, 1.175, 1.2, 1.25, 1.3, 1.5, 2.0, 2.6])
    smooth = 1e-4 * np.exp(1.3 * x) + 1e-3 * (x - 1.2) ** 2
    assert jumps(x, smooth, 1e-5) == ()
    gaps = [None if 4 <= i < 8 or i == 10 else v for i, v in enumerate(smooth)]
    assert jumps(x, gaps, 1e-5) == ()
    smooth[6] += 2e-3
    assert jumps(x, smooth, 1e-5) == (6,)


def test_an_end_of_the_curvature_is_no_transition():
    x = np.linspace(1.0, 2.0, 11)
    assert extremum_of_second_derivative(x, x**4) is None
    assert extremum_of_second_derivative(x, 3.0 * x) is None
    assert extremum_of_second_derivative(x[:4], x[:4] ** 2) is None


@pytest.mark.parametrize("spacing", [0.1, 0.073])
def test_a_level_crossing_is_located_between_the_points(spacing):
    # Two levels of a coupling, each with a little curvature, that cross at 1.037.
    x = np.arange(0.2, 2.0, spacing)
    levels = np.array([-1.0 - 0.3 * x - 0.02 * x**2, -1.0 - 0.3 * 1.037 - 0.9 * (x - 1.037) - 0.05 * (x - 1.037) ** 2 - 0.02 * 1.037**2])
    (place,) = level_crossings(x, levels.min(axis=0))
    assert place == pytest.approx(1.037, abs=0.02 * spacing + 0.002)


def test_a_smooth_transition_is_no_level_crossing():
    n = 200
    k = (2 * np.arange(n) + 1) * np.pi / n
    fields = np.linspace(0.5, 1.5, 41)
    assert level_crossings(fields, [-np.sqrt(1 + h * h - 2 * h * np.cos(k)).sum() for h in fields]) == ()


def test_the_crossing_of_two_xx_chain_sectors_is_found():
    # XX ring of 6 sites in a field (free fermions, Lieb, Schultz and Mattis 1961): the filling changes where two levels meet.
    momenta = {n: [2 * np.pi * (m + (0.5 if n % 2 == 0 else 0.0)) / 6 for m in range(6)] for n in range(7)}
    lowest = {n: sum(sorted(np.cos(k) for k in momenta[n])[:n]) for n in range(7)}
    fields = np.linspace(0.02, 1.3, 65)
    energies = [min(lowest[n] - h * (3 - n) for n in range(7)) for h in fields]
    exact = [lowest[n - 1] - lowest[n] for n in (3, 2, 1)]
    assert level_crossings(fields, energies) == pytest.approx(exact, abs=1e-3)
