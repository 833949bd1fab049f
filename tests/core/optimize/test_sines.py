"""Minima of short sums of sines in closed form."""

import numpy as np
import pytest

from thalweg.optimize.sines import lowest_of_sine, lowest_of_sines, sample_places


def sums(rng: np.random.Generator, degree: int):
    a, b = rng.normal(size=(2, degree + 1))
    orders = np.arange(degree + 1)
    return lambda u: float((a * np.cos(orders * u) + b * np.sin(orders * u)).sum())


@pytest.mark.parametrize("seed", range(5))
def test_one_sine_is_lowest_where_the_published_formula_says(seed):
    """Nakanishi, Fujii and Todo 2020: three values, at phi and phi +- pi/2."""
    f = sums(np.random.default_rng(seed), 1)
    place, lowest = lowest_of_sine(f(0), f(np.pi / 2), f(-np.pi / 2))
    assert f(place) == pytest.approx(lowest, abs=1e-14)
    assert lowest <= min(f(u) for u in np.linspace(-np.pi, np.pi, 1000)) + 1e-12
    assert -np.pi < place <= np.pi


@pytest.mark.parametrize("degree", [1, 2, 3, 4, 8])
def test_sums_of_any_degree_are_minimised_over_the_whole_circle(degree):
    """Degree two from five values is the form for excitation rotations."""
    for seed in range(5):
        f = sums(np.random.default_rng(seed), degree)
        values = np.array([f(u) for u in sample_places(degree)])
        place, lowest = lowest_of_sines(values)
        assert f(place) == pytest.approx(lowest, abs=1e-10)
        assert lowest <= min(f(u) for u in np.linspace(-np.pi, np.pi, 2000)) + 1e-10


def test_a_constant_stays_where_it_is():
    assert lowest_of_sines(np.full(5, 2.0)) == (0.0, pytest.approx(2.0))
