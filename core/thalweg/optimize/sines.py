"""Sums of few sines: the energy along one parameter, found from few values and minimised in closed form."""

from __future__ import annotations

import numpy as np

from thalweg.arrays import FloatArray


def lowest_of_sine(here: float, plus: float, minus: float) -> tuple[float, float]:
    """Where a + b cos u + c sin u is lowest, and how low, from its values at u = 0, pi/2 and -pi/2; the place lies in (-pi, pi].

    u* = -pi/2 - atan2(2 f(0) - f(pi/2) - f(-pi/2), f(pi/2) - f(-pi/2)) (Nakanishi, Fujii and Todo 2020; Parrish et al. 2019;
    Ostaszewski et al. 2021).
    """
    even, odd = 2 * here - plus - minus, plus - minus
    place = -np.pi / 2 - np.arctan2(even, odd)
    return float(np.pi - (np.pi - place) % (2 * np.pi)), 0.5 * (plus + minus) - 0.5 * float(np.hypot(even, odd))


def sample_places(degree: int) -> FloatArray:
    """Places from which a sum of sines of this degree is found: 0, pi/2, -pi/2 for one, otherwise 2 d + 1 evenly over the circle."""
    if degree == 1:
        return np.array([0.0, np.pi / 2, -np.pi / 2])
    return 2 * np.pi * np.arange(2 * degree + 1) / (2 * degree + 1)


def lowest_of_sines(values: FloatArray) -> tuple[float, float]:
    """Where sum_m a_m cos(m u) + b_m sin(m u) up to degree d is lowest, and how low, from its values at `sample_places(d)`.

    Beyond degree one the slope is a polynomial in exp(i u), whose roots on the unit circle are the stationary points.
    """
    degree = (values.size - 1) // 2
    if degree == 1:
        return lowest_of_sine(*values.tolist())
    spectrum = np.fft.fft(values) / values.size  # f(u) = sum_m spectrum[m] exp(i m u), m = -d ... d
    orders = np.arange(-degree, degree + 1)
    coefficients = spectrum[orders]
    roots = np.roots((1j * orders * coefficients)[::-1])
    places = np.concatenate([[0.0], np.angle(roots[np.abs(roots) > 0])])
    heights = (np.exp(1j * np.outer(places, orders)) @ coefficients).real
    best = int(np.argmin(heights))
    return float(places[best]), float(heights[best])
