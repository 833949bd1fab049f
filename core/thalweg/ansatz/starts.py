"""Starts that need no knowledge of the system, shared by the trial states."""

from __future__ import annotations

from typing import Literal

import numpy as np

from thalweg.arrays import FloatArray

#: Width in radians of the `small-random` start.
SMALL_WIDTH = 0.1

PlainStart = Literal["zero", "small-random", "uniform-random"]
Start = Literal["zero", "mp2", "small-random", "uniform-random"]

PLAIN_START_HELP = "Zero angles, normal angles of width 0.1, or uniform angles over the whole circle."
START_HELP = "Zero, first-order (MP2) amplitudes, normal angles of width 0.1, or uniform angles over the whole circle."


def start_angles(start: str, count: int, rng: np.random.Generator) -> FloatArray:
    """Angles in radians, shape (count,)."""
    if start == "zero":
        return np.zeros(count)
    if start == "small-random":
        return rng.normal(0.0, SMALL_WIDTH, count)
    return rng.uniform(-np.pi, np.pi, count)
