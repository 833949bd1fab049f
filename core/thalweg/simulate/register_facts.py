"""What is read off a register state: the heaviest basis states, its weight in the ground space, the energy variance."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from thalweg.arrays import ComplexArray
from thalweg.simulate.engine import LeadingState

#: Basis states listed, and the weight below which none is.
MAX_LEADING = 12
LEAST_WEIGHT = 1e-12
#: Amplitudes looked at together, so that no second array of the register's size is made.
CHUNK = 1 << 18


def leading_states(state: ComplexArray, exact_vectors: Any | None, label: Callable[[int], str]) -> tuple[LeadingState, ...]:
    """The largest |c|^2, descending, each with its weight in the exact ground space (the mean over degenerate states)."""
    best = np.empty(0, dtype=np.int64)
    for first in range(0, state.size, CHUNK):
        part = np.abs(state[first : first + CHUNK]) ** 2
        best = np.concatenate([best, first + np.argsort(-part, kind="stable")[:MAX_LEADING]])
        best = best[np.argsort(-(np.abs(state[best]) ** 2), kind="stable")[:MAX_LEADING]]
    weights = np.abs(state[best]) ** 2
    exact = None if exact_vectors is None else np.mean(np.abs(exact_vectors[:, best]) ** 2, axis=0)
    return tuple(
        LeadingState(label(int(bits)), float(weight), None if exact is None else float(exact[i]))
        for i, (bits, weight) in enumerate(zip(best, weights, strict=True))
        if weight > LEAST_WEIGHT
    )


def ground_weight(vectors: Any, state: ComplexArray) -> float:
    """Weight of the state in the space of the vectors, shape (degeneracy, 2^n); each row is projected on by itself."""
    return float(sum(abs(np.vdot(vector, state)) ** 2 for vector in vectors))


def squared_distance(image: ComplexArray, energy: float, state: ComplexArray) -> float:
    """|H psi - E psi|^2, which is the variance <H^2> - <H>^2 without the loss of digits."""
    total = 0.0
    for first in range(0, state.size, CHUNK):
        difference = image[first : first + CHUNK] - energy * state[first : first + CHUNK]
        total += float(np.vdot(difference, difference).real)
    return total
