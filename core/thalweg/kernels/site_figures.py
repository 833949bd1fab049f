"""Expectation values on the sites of a spin lattice, from the amplitudes of a register."""

from __future__ import annotations

import numpy as np
from numba import njit

from thalweg.arrays import FloatArray


@njit(cache=True, nogil=True)
def pair_swaps(real: FloatArray, imag: FloatArray, first: int, second: int) -> float:  # pragma: no cover - compiled
    """Re <psi| P |psi> of the operator that exchanges qubits `first` and `second`; amplitudes of shape (2^n,)."""
    a, b = np.uint64(1) << np.uint64(first), np.uint64(1) << np.uint64(second)
    total = 0.0
    for k in range(real.size):
        index = np.uint64(k)
        ones = ((index & a) != 0) != ((index & b) != 0)
        other = index ^ (a | b) if ones else index
        total += real[k] * real[other] + imag[k] * imag[other]
    return total


@njit(cache=True, nogil=True)
def z_moments(weights: FloatArray, n: int) -> tuple[FloatArray, FloatArray]:  # pragma: no cover - compiled
    """<Z_i>, shape (n,), and <Z_i Z_j>, shape (n, n), of the probabilities of basis states, shape (2^n,)."""
    single, double = np.zeros(n), np.zeros((n, n))
    signs = np.empty(n)
    for k in range(weights.size):
        w = weights[k]
        if w == 0.0:
            continue
        for i in range(n):
            signs[i] = 1.0 - 2.0 * ((k >> i) & 1)
        for i in range(n):
            wi = w * signs[i]
            single[i] += wi
            for j in range(i, n):
                double[i, j] += wi * signs[j]
    for i in range(n):
        for j in range(i):
            double[i, j] = double[j, i]
    return single, double
