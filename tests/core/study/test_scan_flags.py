"""Flags fall on what was built in, and on nothing else."""

import numpy as np
import pytest

from thalweg.study.scan_flags import extremum_of_second_derivative, jumps, spin_crossings

SMOOTH = [1e-5 * (1 + 0.2 * i + 0.03 * i * i) for i in range(20)]


def test_a_smooth_error_curve_has_no_jump():
    assert jumps(SMOOTH, 1e-6) == ()


@pytest.mark.parametrize("place", [0, 1, 9, 18, 19])
def test_a_single_high_point_is_found(place):
    values = list(SMOOTH)
    values[place] += 3e-3
    assert jumps(values, 1e-4) == (place,)


def test_a_step_to_another_branch_is_found_at_its_first_high_point():
    values = [v + (2e-3 if i >= 12 else 0) for i, v in enumerate(SMOOTH)]
    assert jumps(values, 1e-4) == (12,)


def test_a_steep_but_smooth_rise_is_not_a_jump():
    assert jumps([1e-3 * 1.6**i for i in range(12)], 1e-4) == ()


def test_missing_points_do_not_hide_a_jump():
    values = list(SMOOTH)
    values[5], values[6] = None, values[6] + 4e-3
    assert jumps(values, 1e-4) == (6,)


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
