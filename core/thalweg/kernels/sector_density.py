"""One-particle density matrix and S^2 of real sector amplitudes."""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def spin_density(matrix: np.ndarray, strings: np.ndarray, singles: Any, m: int) -> np.ndarray:
    """<a+_p a_q> of the spin whose strings label the rows of `matrix`, shape (M, M)."""
    first, end, pq, sign, _ = singles
    gamma = np.zeros(m * m)
    for i in range(strings.size):
        weight = _overlap(matrix, i, i)
        for p in range(m):
            if (strings[i] >> np.uint64(p)) & np.uint64(1):
                gamma[p * (m + 1)] += weight
        for x in range(first[i, first.shape[1] - 1]):
            gamma[pq[i, x]] += sign[i, x] * _overlap(matrix, i, end[i, x])
    return gamma.reshape(m, m)


@njit(cache=True, nogil=True, fastmath={"reassoc", "contract"})
def _overlap(matrix: np.ndarray, i: int, j: int) -> float:
    total = 0.0
    for c in range(np.uint64(matrix.shape[1])):
        total += matrix[i, c] * matrix[j, c]
    return total


@njit(cache=True, nogil=True)
def spin_exchange(matrix: np.ndarray, alpha_strings: np.ndarray, alpha_singles: Any, beta_strings: np.ndarray, beta_singles: Any, m: int) -> float:
    """sum_pq <E^alpha_pq E^beta_qp>, from which <S^2> = S_z^2 + N/2 - this."""
    a_first, a_end, a_pq, a_sign, _ = alpha_singles
    b_first, b_end, b_pq, b_sign, _ = beta_singles
    last_a, last_b = a_first.shape[1] - 1, b_first.shape[1] - 1
    total = 0.0
    for a in range(alpha_strings.size):
        for b in range(beta_strings.size):
            c = matrix[a, b]
            if c == 0.0:
                continue
            part = c * float(_common(alpha_strings[a] & beta_strings[b]))
            for x in range(a_first[a, last_a]):
                p, q = a_pq[a, x] // m, a_pq[a, x] % m
                wanted = q * m + p
                if not (beta_strings[b] >> np.uint64(p)) & np.uint64(1) or (beta_strings[b] >> np.uint64(q)) & np.uint64(1):
                    continue
                for y in range(b_first[b, last_b]):
                    if b_pq[b, y] == wanted:
                        part += a_sign[a, x] * b_sign[b, y] * matrix[a_end[a, x], b_end[b, y]]
            total += c * part
    return total


@njit(cache=True, nogil=True)
def _common(mask: np.uint64) -> int:
    n = 0
    while mask:
        mask &= mask - np.uint64(1)
        n += 1
    return n
