"""The Hamiltonian among the strings of one spin: diagonal, single and double replacements with their matrix elements.

Source: Slater-Condon rules in second-quantised form; h[p,q] one-body, (pq|rs) chemist's integrals without the 1/2.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit

from thalweg.kernels.bits import count_bits, rank_of


@njit(cache=True, nogil=True)
def diagonal(strings: np.ndarray, h: np.ndarray, eri: np.ndarray) -> np.ndarray:
    """<S|H_s|S> of every string, shape (N,): sum h_pp + 1/2 sum (pp|qq) - (pq|qp)."""
    m = h.shape[0]
    out = np.zeros(strings.size)
    for i in range(strings.size):
        for p in range(m):
            if (strings[i] >> np.uint64(p)) & np.uint64(1):
                out[i] += h[p, p]
                for q in range(p):
                    if (strings[i] >> np.uint64(q)) & np.uint64(1):
                        out[i] += eri[p, p, q, q] - eri[p, q, q, p]
    return out


@njit(cache=True, nogil=True)
def singles(strings: np.ndarray, inverse: np.ndarray, binomial: np.ndarray, irreps: np.ndarray, n_irreps: int, h: np.ndarray, eri: np.ndarray) -> Any:
    """Replacements q -> p of every string, sorted by irrep of pq within a string.

    Returns:
        first: (N, G + 1), where the replacements of each irrep begin.
        end, pq, sign, value: (N, S) position of the new string, p M + q, sign, and <S'|H_s|S>.
    """
    m = h.shape[0]
    n = strings.size
    occupied = int(count_bits(strings[0]))
    per_string = occupied * (m - occupied)
    first = np.zeros((n, n_irreps + 1), np.int64)
    end, pq = np.empty((n, per_string), np.int64), np.empty((n, per_string), np.int64)
    sign, value = np.empty((n, per_string)), np.empty((n, per_string))
    one = np.uint64(1)
    for i in range(n):
        mask, k = strings[i], 0
        for g in range(n_irreps):
            first[i, g] = k
            for q in range(m):
                if not (mask >> np.uint64(q)) & one:
                    continue
                for p in range(m):
                    if (mask >> np.uint64(p)) & one or irreps[p] ^ irreps[q] != g:
                        continue
                    rest = mask ^ (one << np.uint64(q))
                    low, high = min(p, q), max(p, q)
                    between = rest & ((one << np.uint64(high)) - one) & ~((one << np.uint64(low)) - one)
                    s = 1.0 - 2.0 * float(count_bits(between) & one)
                    end[i, k] = inverse[rank_of(rest | (one << np.uint64(p)), binomial)]
                    pq[i, k], sign[i, k] = p * m + q, s
                    element = h[p, q]
                    for r in range(m):
                        if (rest >> np.uint64(r)) & one:
                            element += eri[p, q, r, r] - eri[p, r, r, q]
                    value[i, k] = s * element
                    k += 1
        first[i, n_irreps] = k
    return first, end, pq, sign, value


@njit(cache=True, nogil=True)
def count_doubles(strings: np.ndarray, irreps: np.ndarray, m: int) -> np.ndarray:
    """Number of totally symmetric double replacements of every string, shape (N,)."""
    out = np.zeros(strings.size, np.int64)
    one = np.uint64(1)
    for i in range(strings.size):
        mask = strings[i]
        for q in range(m):
            for s in range(q + 1, m):
                if not ((mask >> np.uint64(q)) & (mask >> np.uint64(s)) & one):
                    continue
                for p in range(m):
                    if (mask >> np.uint64(p)) & one:
                        continue
                    for r in range(p + 1, m):
                        if not (mask >> np.uint64(r)) & one and irreps[p] ^ irreps[q] ^ irreps[r] ^ irreps[s] == 0:
                            out[i] += 1
    return out


@njit(cache=True, nogil=True)
def doubles(strings: np.ndarray, inverse: np.ndarray, binomial: np.ndarray, irreps: np.ndarray, eri: np.ndarray, first: np.ndarray) -> Any:
    """Totally symmetric double replacements q < s -> p < r: (end, value), rows delimited by `first` (N + 1,)."""
    m = irreps.size
    end, value = np.empty(first[-1], np.int64), np.empty(first[-1])
    one = np.uint64(1)
    for i in range(strings.size):
        mask, k = strings[i], first[i]
        for q in range(m):
            for s in range(q + 1, m):
                if not ((mask >> np.uint64(q)) & (mask >> np.uint64(s)) & one):
                    continue
                bit_q, bit_s = one << np.uint64(q), one << np.uint64(s)
                hole = mask ^ bit_q ^ bit_s
                annihilated = count_bits(mask & (bit_q - one)) + count_bits((mask ^ bit_q) & (bit_s - one))
                for p in range(m):
                    if (mask >> np.uint64(p)) & one:
                        continue
                    for r in range(p + 1, m):
                        if (mask >> np.uint64(r)) & one or irreps[p] ^ irreps[q] ^ irreps[r] ^ irreps[s] != 0:
                            continue
                        bit_p, bit_r = one << np.uint64(p), one << np.uint64(r)
                        created = count_bits(hole & (bit_r - one)) + count_bits((hole | bit_r) & (bit_p - one))
                        phase = 1.0 - 2.0 * float((annihilated + created) & one)
                        end[k] = inverse[rank_of(hole | bit_p | bit_r, binomial)]
                        value[k] = phase * (eri[p, q, r, s] - eri[p, s, r, q])
                        k += 1
    return end, value


@njit(cache=True, nogil=True)
def element(alpha: np.uint64, beta: np.uint64, alpha2: np.uint64, beta2: np.uint64, h: np.ndarray, eri: np.ndarray) -> float:
    """<D|H|D2> of two determinants without the core energy, alpha string left of beta."""
    moved_a, moved_b = count_bits(alpha ^ alpha2), count_bits(beta ^ beta2)
    if moved_a + moved_b > np.uint64(4):
        return 0.0
    if moved_a == np.uint64(2) and moved_b == np.uint64(2):
        p, q, s = _single(alpha, alpha2)
        r, t, u = _single(beta, beta2)
        return s * u * eri[p, q, r, t]
    if moved_a + moved_b == np.uint64(0):
        return _mean_field_diagonal(alpha, beta, h, eri)
    own, own2, other = (alpha, alpha2, beta) if moved_b == np.uint64(0) else (beta, beta2, alpha)
    if count_bits(own ^ own2) == np.uint64(4):
        return _double(own, own2, eri)
    p, q, s = _single(own, own2)
    total = h[p, q]
    for r in range(h.shape[0]):
        if (own & own2) >> np.uint64(r) & np.uint64(1):
            total += eri[p, q, r, r] - eri[p, r, r, q]
        if (other >> np.uint64(r)) & np.uint64(1):
            total += eri[p, q, r, r]
    return s * total


@njit(cache=True, nogil=True)
def _lowest(mask: np.uint64) -> int:
    p = 0
    while not (mask >> np.uint64(p)) & np.uint64(1):
        p += 1
    return p


@njit(cache=True, nogil=True)
def _single(new: np.uint64, old: np.uint64) -> tuple[int, int, float]:
    """(p, q, sign) with a+_p a_q |old> = sign |new>."""
    p, q = _lowest(new & ~old), _lowest(old & ~new)
    one = np.uint64(1)
    between = (new & old) & ((one << np.uint64(max(p, q))) - one) & ~((one << np.uint64(min(p, q))) - one)
    return p, q, 1.0 - 2.0 * float(count_bits(between) & one)


@njit(cache=True, nogil=True)
def _double(new: np.uint64, old: np.uint64, eri: np.ndarray) -> float:
    one = np.uint64(1)
    gone, come = old & ~new, new & ~old
    q, p = _lowest(gone), _lowest(come)
    s, r = _lowest(gone ^ (one << np.uint64(q))), _lowest(come ^ (one << np.uint64(p)))
    middle = (old ^ (one << np.uint64(q))) | (one << np.uint64(p))
    _, _, first = _single(middle, old)
    _, _, second = _single(new, middle)
    return first * second * (eri[p, q, r, s] - eri[p, s, r, q])


@njit(cache=True, nogil=True)
def _mean_field_diagonal(alpha: np.uint64, beta: np.uint64, h: np.ndarray, eri: np.ndarray) -> float:
    total = 0.0
    one = np.uint64(1)
    for p in range(h.shape[0]):
        in_a, in_b = float((alpha >> np.uint64(p)) & one), float((beta >> np.uint64(p)) & one)
        total += (in_a + in_b) * h[p, p] + in_a * in_b * eri[p, p, p, p]
        for q in range(p):
            a, b = float((alpha >> np.uint64(q)) & one), float((beta >> np.uint64(q)) & one)
            total += (in_a + in_b) * (a + b) * eri[p, p, q, q] - (in_a * a + in_b * b) * eri[p, q, q, p]
    return total


@njit(cache=True, nogil=True)
def small_matrix(alphas: np.ndarray, betas: np.ndarray, h: np.ndarray, eri: np.ndarray) -> np.ndarray:
    """H among a few determinants, shape (n, n)."""
    n = alphas.size
    out = np.empty((n, n))
    for i in range(n):
        for j in range(i + 1):
            out[i, j] = out[j, i] = element(alphas[i], betas[i], alphas[j], betas[j], h, eri)
    return out


@njit(cache=True, nogil=True)
def determinant_energies(alphas: np.ndarray, betas: np.ndarray, h: np.ndarray, eri: np.ndarray) -> np.ndarray:
    """<D|H|D> without the core energy of each pair of masks, shape (n,)."""
    out = np.empty(alphas.size)
    for i in range(alphas.size):
        out[i] = _mean_field_diagonal(alphas[i], betas[i], h, eri)
    return out
