"""States of a program with all their derivatives, carried forward factor by factor.

`slopes` has shape (amplitudes, K), one column a parameter, so that a factor acts on contiguous rows. Columns are in the order in which
parameters first act: after `active` of them the others are still zero.
"""

from __future__ import annotations

import numpy as np
from numba import njit, uint64

from thalweg.kernels.register_bits import popcount, sign

ROTATION, CZ, CNOT, HADAMARD = 0, 1, 2, 3  # as `circuit.program.Gate`
_ROOT = 0.5**0.5


@njit(cache=True, nogil=True)
def excitation_slopes(psi, slopes, columns, beta_strings, alpha, beta, factors, angles, weights):  # type: ignore[no-untyped-def]
    """Applies exp(angle (T - T+)) for every factor and adds weight (T - T+) psi to its column.

    psi: (Na * Nb,); alpha, beta: tuples (first (E + 1,), start, end, sign) of string pairs; columns: (F,) column of each factor;
    factors: (F, 2) alpha and beta excitation of each.
    """
    active = 0
    for f in range(factors.shape[0]):
        ea, eb, column = factors[f, 0], factors[f, 1], columns[f]
        active = max(active, column + 1)
        c, s = np.cos(angles[f]), np.sin(angles[f])
        for p in range(alpha[0][ea], alpha[0][ea + 1]):
            for q in range(beta[0][eb], beta[0][eb + 1]):
                i = alpha[1][p] * beta_strings + beta[1][q]
                j = alpha[2][p] * beta_strings + beta[2][q]
                sign_pq = alpha[3][p] * beta[3][q]
                t = s * sign_pq
                for k in range(active):
                    u, v = slopes[i, k], slopes[j, k]
                    slopes[i, k], slopes[j, k] = c * u - t * v, c * v + t * u
                u, v = psi[i], psi[j]
                psi[i], psi[j] = c * u - t * v, c * v + t * u
                slopes[i, column] -= weights[f] * sign_pq * psi[j]
                slopes[j, column] += weights[f] * sign_pq * psi[i]


@njit(cache=True, nogil=True)
def gate_slopes(psi, slopes, kind, x, z, columns, angles, weights):  # type: ignore[no-untyped-def]
    """Applies every gate, and adds weight (-i/2 P) psi to the column of each rotation that has one (-1: none).

    psi: (2^n,) complex; kind, x, z, columns, angles, weights: (F,).
    """
    active = 0
    for f in range(kind.size):
        if columns[f] >= 0:
            active = max(active, columns[f] + 1)
        if kind[f] == ROTATION:
            rotate(psi, slopes, active, x[f], z[f], angles[f], columns[f], weights[f])
        elif kind[f] == CZ:
            both = x[f] | z[f]
            for a in range(psi.size):
                if uint64(a) & both == both:
                    psi[a] = -psi[a]
                    for k in range(active):
                        slopes[a, k] = -slopes[a, k]
        else:
            mix_or_flip(psi, slopes, active, kind[f], x[f], z[f])


@njit(cache=True, nogil=True)
def rotate(psi, slopes, active, x, z, angle, column, weight):  # type: ignore[no-untyped-def]
    """exp(-i angle/2 P) on everything, P = i^|x&z| X^x Z^z, and the slope of the rotation itself."""
    c, s = np.cos(0.5 * angle) + 0.0j, -1j * np.sin(0.5 * angle)
    phase = 1j ** (popcount(x & z) % 4)
    flip = np.int64(x)
    for a in range(psi.size):
        b = a ^ flip
        if b < a:
            continue
        to_b = phase * sign(uint64(a) & z)  # P|a> = to_b |b>
        to_a = phase * sign(uint64(b) & z)
        if a == b:
            turn = c + s * to_a
            for k in range(active):
                slopes[a, k] *= turn
            psi[a] *= turn
            if column >= 0:
                slopes[a, column] += -0.5j * weight * to_a * psi[a]
            continue
        for k in range(active):
            u, v = slopes[a, k], slopes[b, k]
            slopes[a, k], slopes[b, k] = c * u + s * to_a * v, c * v + s * to_b * u
        u, v = psi[a], psi[b]
        psi[a], psi[b] = c * u + s * to_a * v, c * v + s * to_b * u
        if column >= 0:
            slopes[a, column] += -0.5j * weight * to_a * psi[b]
            slopes[b, column] += -0.5j * weight * to_b * psi[a]


@njit(cache=True, nogil=True)
def mix_or_flip(psi, slopes, active, kind, x, z):  # type: ignore[no-untyped-def]
    """A Hadamard on the qubit of x, or a CNOT with control x and target z."""
    target = np.int64(x) if kind == HADAMARD else np.int64(z)
    for a in range(psi.size):
        if a & target or (kind == CNOT and not uint64(a) & x):
            continue
        b = a | target
        for k in range(active):
            u, v = slopes[a, k], slopes[b, k]
            slopes[a, k], slopes[b, k] = (_ROOT * (u + v), _ROOT * (u - v)) if kind == HADAMARD else (v, u)
        u, v = psi[a], psi[b]
        psi[a], psi[b] = (_ROOT * (u + v), _ROOT * (u - v)) if kind == HADAMARD else (v, u)
