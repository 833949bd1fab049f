"""How many shots each measurement set takes."""

from __future__ import annotations

import numpy as np

from thalweg.arrays import FloatArray, IntArray

#: A variance needs two shots.
LEAST = 2


def spread(total: int, shares: FloatArray, least: int = LEAST) -> IntArray:
    """`total` shots by shares, shape (G,), at least `least` to each set; whole numbers by largest remainders.

    Sets below the floor are raised to it, and the rest is shared by the others, so that the sum is `total` wherever it is at least G `least`.
    """
    count = shares.size
    shots = np.full(count, least, np.int64)
    free = np.ones(count, bool)
    left = float(total)
    while free.any():
        scale = shares[free].sum()
        wanted = left * shares[free] / scale if scale > 0 else np.full(int(free.sum()), left / free.sum())
        low = wanted < least
        if not low.any():
            shots[free] = _whole(wanted, round(left))
            break
        places = np.flatnonzero(free)[low]
        free[places] = False
        left -= least * places.size
    return shots


def _whole(wanted: FloatArray, total: int) -> IntArray:
    whole = np.floor(wanted).astype(np.int64)
    order = np.argsort(whole - wanted, kind="stable")
    whole[order[: total - int(whole.sum())]] += 1
    return whole


def best_figure(deviations: FloatArray) -> float:
    """Shots times squared standard error under the best allocation, n_g ~ sigma_g: (sum sigma_g)^2, for deviations of shape (G,)."""
    return float(deviations.sum() ** 2)


def smoothed_variance(sample: FloatArray, shots: IntArray, weights: FloatArray) -> FloatArray:
    """Sample variances pulled towards the largest possible one, weight^2, as by one more shot: a set that never varied may still do so."""
    smoothed: FloatArray = (shots * sample + weights**2) / (shots + 1.0)
    return smoothed
