"""Shots go round exactly, by their shares, and the best figure is the smallest."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from thalweg.evaluate.allocation import LEAST, best_figure, smoothed_variance, spread


@given(st.lists(st.floats(0, 1e3), min_size=1, max_size=12), st.integers(0, 10_000))
def test_every_set_gets_the_least_and_the_sum_is_exact(shares, extra):
    total = LEAST * len(shares) + extra
    shots = spread(total, np.array(shares))
    assert shots.sum() == total
    assert shots.min() >= LEAST


def test_shares_are_kept_where_they_divide():
    assert spread(100, np.array([1.0, 3.0, 6.0])).tolist() == [10, 30, 60]
    assert spread(10, np.zeros(5)).tolist() == [2] * 5
    assert spread(12, np.array([100.0, 1e-9, 1e-9])).tolist() == [8, 2, 2]


def test_shares_by_deviation_have_the_least_variance():
    deviations = np.array([0.1, 0.5, 2.0, 0.01])
    total = 10**7
    variance = [float((deviations**2 / spread(total, shares)).sum()) for shares in (deviations, np.ones(4), deviations**2)]
    assert variance[0] == min(variance)
    assert variance[0] * total == pytest.approx(best_figure(deviations), rel=1e-5)


def test_a_set_that_never_varied_still_gets_a_share():
    assert smoothed_variance(np.array([0.0]), np.array([9]), np.array([2.0]))[0] == pytest.approx(0.4)
