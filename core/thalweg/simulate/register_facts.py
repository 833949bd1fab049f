"""What is read off a register state: the heaviest basis states, its weight in the ground space, the energy variance.

Everything goes through the state in chunks: no second array of the register's size is made, and a stop is noticed between them.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Any

import numpy as np

from thalweg.simulate.engine import LeadingState
from thalweg.watch import Watch

#: Basis states listed, and the weight below which none is.
MAX_LEADING = 12
LEAST_WEIGHT = 1e-12
CHUNK = 1 << 19


def leading_states(state: Any, exact_vectors: Any | None, label: Callable[[int], str], watch: Watch) -> tuple[LeadingState, ...]:
    """The largest |c|^2, descending, each with its weight in the exact ground space (the mean over degenerate states)."""
    best = np.empty(0, dtype=np.int64)
    for chunk in _chunks(state.size, watch):
        weights = np.abs(state[chunk]) ** 2
        own = np.argpartition(-weights, MAX_LEADING)[:MAX_LEADING] if weights.size > MAX_LEADING else np.arange(weights.size)
        best = np.concatenate([best, chunk.start + own])
        best = best[np.lexsort((best, -(np.abs(state[best]) ** 2)))[:MAX_LEADING]]
    weights = np.abs(state[best]) ** 2
    exact = None if exact_vectors is None else np.mean(np.abs(exact_vectors[:, best]) ** 2, axis=0)
    return tuple(
        LeadingState(label(int(bits)), float(weight), None if exact is None else float(exact[i]))
        for i, (bits, weight) in enumerate(zip(best, weights, strict=True))
        if weight > LEAST_WEIGHT
    )


def ground_weight(vectors: Any, state: Any, watch: Watch) -> float:
    """Weight of the state in the space of the vectors, shape (degeneracy, 2^n); each row is projected on by itself."""
    overlaps = np.zeros(len(vectors), dtype=np.complex128)
    for chunk in _chunks(state.size, watch):
        overlaps += np.conj(vectors[:, chunk]) @ state[chunk]
    return float(np.sum(np.abs(overlaps) ** 2))


def squared_distance(image: Any, energy: float, state: Any, watch: Watch) -> float:
    """|H psi - E psi|^2, which is the variance <H^2> - <H>^2 without the loss of digits."""
    total = 0.0
    for chunk in _chunks(state.size, watch):
        difference = image[chunk] - energy * state[chunk]
        total += float(np.vdot(difference, difference).real)
    return total


def _chunks(size: int, watch: Watch) -> Iterator[slice]:
    for first in range(0, size, CHUNK):
        watch.check()
        yield slice(first, min(size, first + CHUNK))
