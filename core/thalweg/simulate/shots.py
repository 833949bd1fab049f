"""Measurement of a register state shot by shot: each set of strings in its basis, bit strings by their probabilities."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from thalweg.arrays import ComplexArray, FloatArray, IntArray, MaskArray
from thalweg.kernels import sampling as kernels
from thalweg.operators.pauli import PauliExpansion

#: Variates held at a time.
PART = 1 << 20


class MeasuredSets:
    """The strings of an expansion, sorted into sets that are read together.

    Attributes:
        constant: coefficient of the identity, which is in no set.
        weights: sum |c_l| of each set, shape (G,).
    """

    def __init__(self, expansion: PauliExpansion, sets: Sequence[IntArray]) -> None:
        """`sets`: indices into the expansion, every string but the identity in one of them; within a set they agree qubit by qubit."""
        members = np.concatenate([np.asarray(s, np.int64) for s in sets]) if sets else np.empty(0, np.int64)
        self._first = np.concatenate([[0], np.cumsum([len(s) for s in sets])]).astype(np.int64)
        self._x, self._z = _bases(expansion.x, sets), _bases(expansion.z, sets)
        self._support = (expansion.x | expansion.z)[members]
        self._coefficients = expansion.coefficients[members]
        self.constant = expansion.identity
        sizes = np.abs(self._coefficients)
        self.weights = np.array([sizes[a:b].sum() for a, b in zip(self._first[:-1], self._first[1:], strict=True)], float)

    def sample(self, state: ComplexArray, shots: IntArray, rng: np.random.Generator) -> FloatArray:
        """(sum, sum of squares) of the values of shots[g] shots of each set, shape (G, 2). state: (2^n,)."""
        sums = np.zeros((self.weights.size, 2))
        state = np.ascontiguousarray(state, complex)
        left = np.asarray(shots, np.int64).copy()
        while left.any():
            now = _first_part(left)
            spacings = rng.standard_exponential(int(now.sum() + np.count_nonzero(now)))
            kernels.sample_sets(state, self._x, self._z, self._first, self._support, self._coefficients, now, spacings, sums)
            left -= now
        return sums

    def counts(self, state: ComplexArray, number: int, shots: int, rng: np.random.Generator) -> IntArray:
        """How often each bit string comes when set `number` is read, shape (2^n,)."""
        turned = np.array(state, complex)
        kernels.turn_to_basis(turned, self._x[number], self._z[number])
        counts = np.empty(turned.size, np.int64)
        kernels.draw(turned, rng.standard_exponential(shots + 1), counts)
        return counts

    def moments(self, state: ComplexArray) -> tuple[FloatArray, FloatArray]:
        """Exact mean and variance of one shot of each set, shape (G,) both."""
        moments = np.empty((self.weights.size, 2))
        kernels.set_moments(np.ascontiguousarray(state, complex), self._x, self._z, self._first, self._support, self._coefficients, moments)
        return moments[:, 0], moments[:, 1]


def _bases(masks: MaskArray, sets: Sequence[IntArray]) -> MaskArray:
    return np.array([np.bitwise_or.reduce(masks[s]) for s in sets], np.uint64)


def _first_part(left: IntArray) -> IntArray:
    """As many of the shots, first sets first, as are drawn at a time."""
    before = np.cumsum(left) - left
    part: IntArray = np.clip(PART - before, 0, left)
    return part
