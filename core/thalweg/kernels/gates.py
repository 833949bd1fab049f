"""Counting the gates of a circuit, as-soon-as-possible depth included."""

from __future__ import annotations

import numpy as np
from numba import njit

from thalweg.arrays import IntArray, MaskArray

ONE = np.uint64(1)


@njit(cache=True, nogil=True)
def count_gates(n_qubits: int, reference: int, is_rotation: np.ndarray, is_pair: np.ndarray, x: MaskArray, z: MaskArray) -> IntArray:
    """(rotations, two-qubit gates, one-qubit gates, depth, two-qubit depth), shape (5,).

    A rotation is written as basis changes on its X and Y, a ladder of CNOT up its qubits, RZ on the highest, and back.

    Args:
        reference: bit mask; one X a set bit.
        is_rotation, is_pair: kind of each gate, shape (F,); a gate that is neither acts on the one qubit of x.
        x, z: masks, shape (F,): the string of a rotation, the two qubits of a pair.
    """
    time, pair_time = np.zeros(n_qubits, np.int64), np.zeros(n_qubits, np.int64)
    rotations = pairs = singles = 0
    for q in range(n_qubits):
        if np.uint64(reference) >> np.uint64(q) & ONE:
            singles += 1
            time[q] += 1
    qubits = np.zeros(n_qubits, np.int64)
    for f in range(x.size):
        weight = 0
        for q in range(n_qubits):
            if (x[f] | z[f]) >> np.uint64(q) & ONE:
                qubits[weight] = q
                weight += 1
        if is_pair[f]:
            pairs += 1
            _join(time, pair_time, qubits[0], qubits[1])
        elif weight == 1:
            singles += 1
            rotations += is_rotation[f]
            time[qubits[0]] += 1
        elif weight > 1:
            rotations += 1
            pairs += 2 * (weight - 1)
            singles += 1 + _turn(time, qubits[:weight], x[f])
            for i in range(weight - 1):
                _join(time, pair_time, qubits[i], qubits[i + 1])
            time[qubits[weight - 1]] += 1
            for i in range(weight - 2, -1, -1):
                _join(time, pair_time, qubits[i], qubits[i + 1])
            singles += _turn(time, qubits[:weight], x[f])
    deepest, deepest_pair = 0, 0
    for q in range(n_qubits):
        deepest, deepest_pair = max(deepest, time[q]), max(deepest_pair, pair_time[q])
    return np.array([rotations, pairs, singles, deepest, deepest_pair])


@njit(cache=True, nogil=True)
def _join(time: IntArray, pair_time: IntArray, a: int, b: int) -> None:
    time[a] = time[b] = max(time[a], time[b]) + 1
    pair_time[a] = pair_time[b] = max(pair_time[a], pair_time[b]) + 1


@njit(cache=True, nogil=True)
def _turn(time: IntArray, qubits: IntArray, x: int) -> int:
    """One basis change on each qubit with X or Y; returns their number."""
    turned = 0
    for q in qubits:
        if x >> np.uint64(q) & ONE:
            time[q] += 1
            turned += 1
    return turned
