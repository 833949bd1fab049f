"""First derivatives of the energy along many generators at one state, from psi and H psi alone."""

from __future__ import annotations

import numpy as np
from numba import njit

from thalweg.kernels.bits import count_bits


@njit(cache=True, nogil=True)
def excitation_slopes(
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
    out: np.ndarray,
) -> None:
    """out[f] = 2 <dual|A_f|psi>, shape (F,). Amplitudes and pairs lie as in `kernels/sector.py`."""
    for f in range(factors.shape[0]):
        ea, eb = factors[f, 0], factors[f, 1]
        total = 0.0
        for h in range(alpha_first.shape[1] - 1):
            k = h ^ irrep
            for x in range(alpha_first[ea, h], alpha_first[ea, h + 1]):
                start, end = row_start[alpha_from[x]], row_start[alpha_to[x]]
                part = 0.0
                for y in range(beta_first[eb, k], beta_first[eb, k + 1]):
                    i, j = start + beta_from[y], end + beta_to[y]
                    part += beta_sign[y] * (dual[j] * psi[i] - dual[i] * psi[j])
                total += alpha_sign[x] * part
        out[f] = 2.0 * total


@njit(cache=True, nogil=True)
def string_slopes(psi: np.ndarray, dual: np.ndarray, x: np.ndarray, z: np.ndarray, out: np.ndarray) -> None:
    """out[s] = Im <dual|P_s|psi>, P = i^|x&z| X^x Z^z, shape (S,); psi and dual: (2^n,) complex."""
    for s in range(x.size):
        flip = np.int64(x[s])
        total = 0.0 + 0.0j
        for b in range(psi.size):
            sign = 1.0 - 2.0 * float(count_bits(z[s] & np.uint64(b)) & np.uint64(1))
            total += sign * np.conj(dual[b ^ flip]) * psi[b]
        phase = count_bits(x[s] & z[s]) & np.uint64(3)
        if phase == 0:
            out[s] = total.imag
        elif phase == 1:
            out[s] = total.real
        elif phase == 2:
            out[s] = -total.imag
        else:
            out[s] = -total.real
