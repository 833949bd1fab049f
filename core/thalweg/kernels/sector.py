"""Excitation rotations exp(theta (T - T+)) on the real amplitudes of a small sector, and the adjoint sweep.

Every factor is a list of amplitude pairs (i, j) with T|i> = |j>; where T|i> = -|j> the pair is listed as (j, i).
"""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def amplitude_pairs(
    row_start: np.ndarray,
    irrep: int,
    alpha_first: np.ndarray,
    alpha_from: np.ndarray,
    alpha_to: np.ndarray,
    alpha_sign: np.ndarray,
    beta_first: np.ndarray,
    beta_from: np.ndarray,
    beta_to: np.ndarray,
    beta_sign: np.ndarray,
    factors: np.ndarray,
) -> tuple[np.ndarray, np.ndarray]:
    """The pairs of every factor from the string pairs of each spin: first (F + 1,), pairs (P, 2) uint32.

    Row `a` begins at row_start[a] and has the beta strings of irrep (total xor irrep of a). alpha_first, beta_first:
    (E, G + 1), string pairs of each excitation by irrep of the first string; alpha pairs name rows, beta pairs name columns
    within an irrep. factors: (F, 2) alpha and beta excitation.
    """
    n_irreps = alpha_first.shape[1] - 1
    first = np.zeros(factors.shape[0] + 1, np.int64)
    for f in range(factors.shape[0]):
        first[f + 1] = first[f]
        for h in range(n_irreps):
            rows = alpha_first[factors[f, 0], h + 1] - alpha_first[factors[f, 0], h]
            first[f + 1] += rows * (beta_first[factors[f, 1], (h ^ irrep) + 1] - beta_first[factors[f, 1], h ^ irrep])
    pairs = np.empty((first[-1], 2), np.uint32)
    n = 0
    for f in range(factors.shape[0]):
        ea, eb = factors[f, 0], factors[f, 1]
        for h in range(n_irreps):
            k = h ^ irrep
            for x in range(alpha_first[ea, h], alpha_first[ea, h + 1]):
                start, end = row_start[alpha_from[x]], row_start[alpha_to[x]]
                for y in range(beta_first[eb, k], beta_first[eb, k + 1]):
                    forward = 0 if alpha_sign[x] * beta_sign[y] > 0.0 else 1
                    pairs[n, forward], pairs[n, 1 - forward] = start + beta_from[y], end + beta_to[y]
                    n += 1
    return first, pairs


@njit(cache=True, nogil=True)
def rotate_all(psi: np.ndarray, first: np.ndarray, pairs: np.ndarray, angles: np.ndarray) -> None:
    """Applies every factor in turn; angles: (F,)."""
    for f in range(angles.size):
        c, s = np.cos(angles[f]), np.sin(angles[f])
        for n in range(np.uint64(first[f]), np.uint64(first[f + 1])):
            i, j = pairs[n, 0], pairs[n, 1]
            u, v = psi[i], psi[j]
            psi[i] = c * u - s * v
            psi[j] = c * v + s * u


@njit(cache=True, nogil=True)
def sweep_back(psi: np.ndarray, dual: np.ndarray, first: np.ndarray, pairs: np.ndarray, angles: np.ndarray, out: np.ndarray) -> None:
    """Undoes every factor on psi and on dual = H psi, last first; out[f] = 2 <dual|A_f|psi>, shape (F,)."""
    for f in range(angles.size - 1, -1, -1):
        c, s = np.cos(angles[f]), -np.sin(angles[f])
        total = 0.0
        for n in range(np.uint64(first[f]), np.uint64(first[f + 1])):
            i, j = pairs[n, 0], pairs[n, 1]
            u, v, p, q = psi[i], psi[j], dual[i], dual[j]
            total += q * u - p * v
            psi[i] = c * u - s * v
            psi[j] = c * v + s * u
            dual[i] = c * p - s * q
            dual[j] = c * q + s * p
        out[f] = 2.0 * total
