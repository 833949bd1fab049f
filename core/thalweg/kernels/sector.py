"""Excitation rotations exp(theta (T - T+)) on real sector amplitudes, and the adjoint sweep.

Amplitudes lie as `operators/sector_layout.py` describes: row `a` of irrep h begins at row_start[a] and has the beta
strings of irrep (total xor h). An excitation is a list of string pairs for each spin, sorted by the irrep of the first
string; `first` (E, G + 1) delimits the pairs. Alpha pairs name rows, beta pairs name columns within an irrep.
"""

from __future__ import annotations

import numpy as np
from numba import njit


@njit(cache=True, nogil=True)
def rotate_all(
    psi: np.ndarray,
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
    angles: np.ndarray,
) -> None:
    """Applies every factor in turn. factors: (F, 2) alpha and beta excitation; angles: (F,)."""
    for f in range(factors.shape[0]):
        c, s = np.cos(angles[f]), np.sin(angles[f])
        ea, eb = factors[f, 0], factors[f, 1]
        for h in range(alpha_first.shape[1] - 1):
            k = h ^ irrep
            for x in range(alpha_first[ea, h], alpha_first[ea, h + 1]):
                start, end = row_start[alpha_from[x]], row_start[alpha_to[x]]
                t = s * alpha_sign[x]
                for y in range(beta_first[eb, k], beta_first[eb, k + 1]):
                    i, j, st = start + beta_from[y], end + beta_to[y], t * beta_sign[y]
                    u, v = psi[i], psi[j]
                    psi[i] = c * u - st * v
                    psi[j] = c * v + st * u


@njit(cache=True, nogil=True)
def sweep_back(
    psi: np.ndarray,
    dual: np.ndarray,
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
    angles: np.ndarray,
    out: np.ndarray,
) -> None:
    """Undoes every factor on psi and on dual = H psi, last first; out[f] = 2 <dual|A_f|psi>, shape (F,)."""
    for f in range(factors.shape[0] - 1, -1, -1):
        c, s = np.cos(angles[f]), -np.sin(angles[f])
        ea, eb = factors[f, 0], factors[f, 1]
        total = 0.0
        for h in range(alpha_first.shape[1] - 1):
            k = h ^ irrep
            for x in range(alpha_first[ea, h], alpha_first[ea, h + 1]):
                start, end = row_start[alpha_from[x]], row_start[alpha_to[x]]
                for y in range(beta_first[eb, k], beta_first[eb, k + 1]):
                    i, j, sign = start + beta_from[y], end + beta_to[y], alpha_sign[x] * beta_sign[y]
                    st = s * sign
                    u, v, p, q = psi[i], psi[j], dual[i], dual[j]
                    total += sign * (q * u - p * v)
                    psi[i], psi[j] = c * u - st * v, c * v + st * u
                    dual[i], dual[j] = c * p - st * q, c * q + st * p
        out[f] = 2.0 * total
