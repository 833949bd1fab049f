"""Fermions to Pauli strings on bit masks: linear encodings, excitation generators, symmetries.

A linear encoding stores the occupations n of the modes as b = A n over GF(2). With U_p = column p of A, F_p = row p of
A^-1 and P_p = xor of F_j over j < p, all as masks, the ladder operators are
    a_p = 1/2 X^U_p Z^P_p (1 - Z^F_p),    a+_p = 1/2 X^U_p Z^P_p (1 + Z^F_p)
(Seeley, Richard and Love 2012; Bravyi and Kitaev 2002). Spin orbital of spatial orbital p: alpha 2p, beta 2p + 1.
A string X^x Z^z with a real weight c is c (-1)^(|x&z|/2) P, P = i^|x&z| X^x Z^z, where |x&z| is even.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit, types
from numba.extending import intrinsic

from thalweg.arrays import FloatArray, IntArray, MaskArray

ONE = np.uint64(1)


@intrinsic
def bit_count(typing_context: Any, mask: Any) -> Any:  # pragma: no cover - compiled
    """Number of set bits of a uint64 (the processor's own instruction)."""

    def generate(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.ctpop(arguments[0])

    return types.uint64(types.uint64), generate


@njit(cache=True, nogil=True)
def encoding_masks(matrix: np.ndarray) -> tuple[MaskArray, MaskArray, MaskArray, bool]:
    """Masks (U, F, P), each shape (n,), of the encoding b = A n; the last value is False where A is singular.

    Args:
        matrix: A, shape (n, n), uint8 of zeros and ones, n <= 62.
    """
    n = matrix.shape[0]
    rows, inverse = np.zeros(n, np.uint64), np.zeros(n, np.uint64)
    update, parity = np.zeros(n, np.uint64), np.zeros(n, np.uint64)
    for i in range(n):
        inverse[i] = ONE << np.uint64(i)
        for j in range(n):
            if matrix[i, j]:
                rows[i] |= ONE << np.uint64(j)
                update[j] |= ONE << np.uint64(i)
    for column in range(n):
        bit = ONE << np.uint64(column)
        pivot = column
        while pivot < n and not rows[pivot] & bit:
            pivot += 1
        if pivot == n:
            return update, inverse, parity, False
        rows[column], rows[pivot] = rows[pivot], rows[column]
        inverse[column], inverse[pivot] = inverse[pivot], inverse[column]
        for i in range(n):
            if i != column and rows[i] & bit:
                rows[i] ^= rows[column]
                inverse[i] ^= inverse[column]
    for p in range(1, n):
        parity[p] = parity[p - 1] ^ inverse[p - 1]
    return update, inverse, parity, True


@njit(cache=True, nogil=True)
def _emit(x: MaskArray, z: MaskArray, c: FloatArray, at: int, cut: float, x_mask: int, z_mask: int, weight: float) -> int:
    """Writes weight X^x Z^z at position `at` unless it is at or below the cut; returns the next position."""
    if abs(weight) <= cut:
        return at
    x[at], z[at] = x_mask, z_mask
    c[at] = -weight if bit_count(x_mask & z_mask) & np.uint64(2) else weight
    return at + 1


@njit(cache=True, nogil=True)
def _hops(update: MaskArray, flip: MaskArray, parity: MaskArray, n_orbitals: int) -> tuple[MaskArray, MaskArray, MaskArray]:
    """x mask, first and second z mask of t_pq = a+_p a_q + a+_q a_p = 1/2 (X^x Z^z0 - X^x Z^z1), shape (2, M, M), p < q."""
    x = np.zeros((2, n_orbitals, n_orbitals), np.uint64)
    z0, z1 = np.zeros_like(x), np.zeros_like(x)
    for spin in range(2):
        for p in range(n_orbitals):
            i = 2 * p + spin
            for q in range(p + 1, n_orbitals):
                j = 2 * q + spin
                x[spin, p, q] = update[i] ^ update[j]
                z0[spin, p, q] = parity[j] ^ parity[i] ^ flip[i]
                z1[spin, p, q] = parity[j] ^ parity[i] ^ flip[j]
    return x, z0, z1


@njit(cache=True, nogil=True)
def count_bound(n_orbitals: int) -> int:
    """The largest number of strings that `map_hamiltonian` can write."""
    m = n_orbitals
    pairs, quads = m * (m - 1) // 2, m * (m - 1) * (m - 2) * (m - 3) // 24
    return 1 + 2 * m + 4 * pairs + m**4 + 2 * pairs + 4 * pairs * max(m - 2, 0) + 12 * quads


@njit(cache=True, nogil=True)
def map_hamiltonian(
    core: float, one_body: FloatArray, two_body: FloatArray, update: MaskArray, flip: MaskArray, parity: MaskArray, cut: float
) -> tuple[MaskArray, MaskArray, FloatArray]:
    """Pauli strings of H = core + sum h_pq E_pq + 1/2 sum (pq|rs) (E_pq E_rs - delta_qr E_ps), each string once, unsorted.

    Written as H = constant + sum_I f_I T_I + 1/2 sum_IJ (I|J) T_I T_J over orbital pairs I = (p <= q), where T_I is the
    traceless part of E_pq + E_qp (of E_pp for p = q). The products of two T_I of one spin on four, three or two orbitals
    and of opposite spins then give disjoint sets of strings, so that none has to be looked up or added up.

    Args:
        one_body: h, shape (M, M), symmetric. two_body: (pq|rs), shape (M, M, M, M), 8-fold symmetric.
        cut: strings with |c| <= cut are left out.

    Returns:
        x, z (uint64) and c (float64), shape (L,).
    """
    m = one_body.shape[0]
    bound = count_bound(m)
    x, z, c = np.empty(bound, np.uint64), np.empty(bound, np.uint64), np.empty(bound)
    hop_x, hop_z0, hop_z1 = _hops(update, flip, parity, m)
    constant, effective = _one_body_part(core, one_body, two_body)
    at = _emit(x, z, c, 0, cut, np.uint64(0), np.uint64(0), constant)
    at = _write_one_spin(x, z, c, at, cut, effective, two_body, flip, hop_x, hop_z0, hop_z1)
    at = _write_four_orbitals(x, z, c, at, cut, two_body, flip, hop_x, hop_z0)
    at = _write_both_spins(x, z, c, at, cut, two_body, flip, hop_x, hop_z0, hop_z1)
    return x[:at].copy(), z[:at].copy(), c[:at].copy()


@njit(cache=True, nogil=True)
def _one_body_part(core: float, h: FloatArray, g: FloatArray) -> tuple[float, FloatArray]:
    """The constant and f_pq = h_pq - 1/2 sum_r (pr|rq) + sum_r (rr|pq)."""
    m = h.shape[0]
    f = h.copy()
    constant = core
    for p in range(m):
        for q in range(m):
            shifted = h[p, q]
            coulomb = 0.0
            for r in range(m):
                shifted -= 0.5 * g[p, r, r, q]
                coulomb += g[p, q, r, r]
            f[p, q] = shifted + coulomb
            if p == q:
                constant += shifted + 0.5 * coulomb + 0.25 * g[p, p, p, p]
            elif p < q:
                constant += 0.5 * g[p, q, p, q]
    return constant, f


@njit(cache=True, nogil=True)
def _write_one_spin(
    x: MaskArray,
    z: MaskArray,
    c: FloatArray,
    at: int,
    cut: float,
    f: FloatArray,
    g: FloatArray,
    flip: MaskArray,
    hop_x: MaskArray,
    hop_z0: MaskArray,
    hop_z1: MaskArray,
) -> int:
    """Z_p, t_pq, Z_p Z_q and Z_p t_qr of each spin.

    {t_pq, t_pr} = t_qr Z_p and t_pq^2 = (1 - Z_p Z_q)/2 bring the exchange integrals in.
    """
    m = f.shape[0]
    for spin in range(2):
        for q in range(m):
            z_q = flip[2 * q + spin]
            at = _emit(x, z, c, at, cut, np.uint64(0), z_q, -0.5 * f[q, q])
            for r in range(q + 1, m):
                z_r = flip[2 * r + spin]
                at = _emit(x, z, c, at, cut, np.uint64(0), z_q ^ z_r, 0.25 * (g[q, q, r, r] - g[q, r, q, r]))
                u, z0, z1 = hop_x[spin, q, r], hop_z0[spin, q, r], hop_z1[spin, q, r]
                at = _emit(x, z, c, at, cut, u, z0, 0.5 * f[q, r])
                at = _emit(x, z, c, at, cut, u, z1, -0.5 * f[q, r])
                for p in range(m):
                    if p in (q, r):
                        continue
                    weight = 0.25 * (g[p, q, p, r] - g[p, p, q, r])
                    z_p = flip[2 * p + spin]
                    at = _emit(x, z, c, at, cut, u, z0 ^ z_p, weight)
                    at = _emit(x, z, c, at, cut, u, z1 ^ z_p, -weight)
    return at


@njit(cache=True, nogil=True)
def _write_four_orbitals(
    x: MaskArray, z: MaskArray, c: FloatArray, at: int, cut: float, g: FloatArray, flip: MaskArray, hop_x: MaskArray, hop_z0: MaskArray
) -> int:
    """(pq|rs) t_pq t_rs + (pr|qs) t_pr t_qs + (ps|qr) t_ps t_qr for p < q < r < s of one spin: six strings."""
    m = g.shape[0]
    for spin in range(2):
        for p in range(m):
            for q in range(p + 1, m):
                for r in range(q + 1, m):
                    for s in range(r + 1, m):
                        u = hop_x[spin, p, q] ^ hop_x[spin, r, s]
                        base = hop_z0[spin, p, q] ^ hop_z0[spin, r, s]
                        f_p, f_q = flip[2 * p + spin], flip[2 * q + spin]
                        f_r, f_s = flip[2 * r + spin], flip[2 * s + spin]
                        first, second, third = g[p, q, r, s], g[p, r, q, s], g[p, s, q, r]
                        at = _emit(x, z, c, at, cut, u, base, 0.25 * (first - third))
                        at = _emit(x, z, c, at, cut, u, base ^ f_p ^ f_q ^ f_r ^ f_s, 0.25 * (first - third))
                        at = _emit(x, z, c, at, cut, u, base ^ f_p ^ f_q, 0.25 * (second - first))
                        at = _emit(x, z, c, at, cut, u, base ^ f_r ^ f_s, 0.25 * (second - first))
                        at = _emit(x, z, c, at, cut, u, base ^ f_q ^ f_r, 0.25 * (third - second))
                        at = _emit(x, z, c, at, cut, u, base ^ f_p ^ f_s, 0.25 * (third - second))
    return at


@njit(cache=True, nogil=True)
def _write_both_spins(
    x: MaskArray,
    z: MaskArray,
    c: FloatArray,
    at: int,
    cut: float,
    g: FloatArray,
    flip: MaskArray,
    hop_x: MaskArray,
    hop_z0: MaskArray,
    hop_z1: MaskArray,
) -> int:
    """sum_IJ (I|J) T_I,alpha T_J,beta."""
    m = g.shape[0]
    for p in range(m):
        for q in range(p, m):
            if p == q:
                u, a0, a1, half = np.uint64(0), flip[2 * p], np.uint64(0), -0.5
            else:
                u, a0, a1, half = hop_x[0, p, q], hop_z0[0, p, q], hop_z1[0, p, q], 0.5
            for r in range(m):
                weight = -0.5 * half * g[p, q, r, r]
                z_r = flip[2 * r + 1]
                at = _emit(x, z, c, at, cut, u, a0 ^ z_r, weight)
                if p != q:
                    at = _emit(x, z, c, at, cut, u, a1 ^ z_r, -weight)
                for s in range(r + 1, m):
                    v, b0, b1 = hop_x[1, r, s], hop_z0[1, r, s], hop_z1[1, r, s]
                    weight = 0.5 * half * g[p, q, r, s]
                    if bit_count(a0 & v) & ONE:
                        weight = -weight
                    at = _emit(x, z, c, at, cut, u ^ v, a0 ^ b0, weight)
                    at = _emit(x, z, c, at, cut, u ^ v, a0 ^ b1, -weight)
                    if p != q:
                        at = _emit(x, z, c, at, cut, u ^ v, a1 ^ b0, -weight)
                        at = _emit(x, z, c, at, cut, u ^ v, a1 ^ b1, weight)
    return at


@njit(cache=True, nogil=True)
def ladder_strings(
    modes: IntArray, creates: np.ndarray, update: MaskArray, flip: MaskArray, parity: MaskArray
) -> tuple[np.uint64, MaskArray, FloatArray]:
    """The product of ladder operators on k distinct modes, the last one acting first, as X^x sum_j c_j Z^z_j.

    Args:
        modes: shape (k,). creates: shape (k,), true for a+ and false for a.

    Returns:
        x, and z and c of shape (2^k,).
    """
    k = modes.size
    z, c = np.zeros(1 << k, np.uint64), np.zeros(1 << k)
    x, filled = np.uint64(0), 1
    c[0] = 1.0
    for i in range(k - 1, -1, -1):
        p = modes[i]
        # X^U Z^a X^x = (-1)^|a&x| X^(U^x) Z^a
        sign = -0.5 if bit_count(parity[p] & x) & ONE else 0.5
        other = sign if creates[i] else -sign
        if bit_count(flip[p] & x) & ONE:
            other = -other
        for j in range(filled):
            z[filled + j], c[filled + j] = z[j] ^ parity[p] ^ flip[p], c[j] * other
            z[j] ^= parity[p]
            c[j] *= sign
        x ^= update[p]
        filled *= 2
    return x, z, c


@njit(cache=True, nogil=True)
def generator_strings(
    modes: IntArray, creates: np.ndarray, ends: IntArray, update: MaskArray, flip: MaskArray, parity: MaskArray
) -> tuple[MaskArray, MaskArray, FloatArray, IntArray]:
    """T - T+ = i sum_j c_j P_j for each of F products T of ladder operators on distinct modes.

    Args:
        modes, creates: the ladder operators of all products, one after the other; see `ladder_strings`.
        ends: where each product ends in them, shape (F,).

    Returns:
        x, z, c and the product that each string belongs to, all of one shape.
    """
    total, begin = 0, 0
    for end in ends:
        total += 1 << (end - begin - 1)
        begin = end
    xs, zs = np.empty(total, np.uint64), np.empty(total, np.uint64)
    cs, owner = np.empty(total), np.empty(total, np.int64)
    at, begin = 0, 0
    for f in range(ends.size):
        x, z, c = ladder_strings(modes[begin : ends[f]], creates[begin : ends[f]], update, flip, parity)
        begin = ends[f]
        for j in range(z.size):
            # (X^x Z^z)+ = (-1)^|x&z| X^x Z^z: an odd number of Y survives, with X^x Z^z = -i (-1)^((|x&z|-1)/2) P
            power = bit_count(x & z[j])
            if power & ONE:
                xs[at], zs[at], owner[at] = x, z[j], f
                cs[at] = 2.0 * c[j] if power & np.uint64(2) else -2.0 * c[j]
                at += 1
    return xs[:at], zs[:at], cs[:at], owner[:at]


@njit(cache=True, nogil=True)
def row_space(masks: MaskArray, n: int) -> MaskArray:
    """Reduced basis over GF(2) of the span of the masks: row q has leading bit q (0 where there is none), shape (n,)."""
    basis = np.zeros(n, np.uint64)
    previous = np.uint64(0)
    for mask in masks:
        if mask == previous:
            continue
        previous = mask
        rest = mask
        for q in range(n - 1, -1, -1):
            if rest >> np.uint64(q) & ONE:
                if basis[q]:
                    rest ^= basis[q]
                else:
                    basis[q] = rest
                    break
    for q in range(n):
        if basis[q]:
            for other in range(q + 1, n):
                if basis[other] >> np.uint64(q) & ONE:
                    basis[other] ^= basis[q]
    return basis
