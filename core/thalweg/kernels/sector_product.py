"""The part of H that couples both spins, sum (pq|rs) E^alpha_pq E^beta_rs, without a matrix.

For each pair p >= q the rows that E_pq + E_qp connects are packed side by side, the sparse matrix
V_pq = sum_rs (pq|rs) E_rs acts on all of them at once, and the products are added to the rows that they belong to.
"""

from __future__ import annotations

import numpy as np
from numba import njit

from thalweg.kernels.product_lanes import multiply_8, multiply_16, multiply_32, pack_tile, unpack_tile

#: Rows packed at once.
LANES = 32


@njit(cache=True, nogil=True)
def row_pairs_of(
    strings: np.ndarray, string_first: np.ndarray, first: np.ndarray, end: np.ndarray, pq: np.ndarray, sign: np.ndarray, m: int
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Pairs (from, to, sign) of E_pq + E_qp (p > q) and of E_pp, bucketed by pair index p (p + 1) / 2 + q and irrep of `from`.

    strings: (N,) of one spin, string_first: (G + 1,); first, end, pq, sign: `spin_strings.singles`.
    Returns bounds (pairs, G + 1), from, to, sign.
    """
    n_irreps = string_first.size - 1
    n_pairs = m * (m + 1) // 2
    count = np.zeros((n_pairs, n_irreps + 1), np.int64)
    total = 0
    for stage in range(2):
        if stage == 1:
            for x in range(n_pairs):
                for h in range(n_irreps + 1):
                    step = count[x, h]
                    count[x, h] = total
                    total += step
            start, stop, signs = np.empty(total, np.int64), np.empty(total, np.int64), np.empty(total)
        for h in range(n_irreps):
            for a in range(string_first[h], string_first[h + 1]):
                for p in range(m):
                    if (strings[a] >> np.uint64(p)) & np.uint64(1):
                        x = p * (p + 1) // 2 + p
                        if stage == 1:
                            start[count[x, h]], stop[count[x, h]], signs[count[x, h]] = a, a, 1.0
                        count[x, h] += 1
                for y in range(first[a, n_irreps]):
                    p, q = pq[a, y] // m, pq[a, y] % m
                    x = max(p, q) * (max(p, q) + 1) // 2 + min(p, q)
                    if stage == 1:
                        start[count[x, h]], stop[count[x, h]], signs[count[x, h]] = a, end[a, y], sign[a, y]
                    count[x, h] += 1
    bounds = np.empty((n_pairs, n_irreps + 1), np.int64)
    for x in range(n_pairs):
        bounds[x, 0] = 0 if x == 0 else bounds[x - 1, n_irreps]
        for h in range(n_irreps):
            bounds[x, h + 1] = count[x, h]
    return bounds, start, stop, signs


@njit(cache=True, nogil=True)
def column_lists_of(
    string_first: np.ndarray, local: np.ndarray, first: np.ndarray, end: np.ndarray, pq: np.ndarray, sign: np.ndarray
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """The elements of V = sum_rs v_rs E_rs by irrep of rs and row string, all rows of an irrep filled up to equal length.

    Returns bounds (G, G + 1) and length (G, G): row b of irrep k has its elements for irrep g of rs at bounds[g, k] +
    (b - string_first[k]) length[g, k]; then column within its irrep, rs, and sign of each element. rs is -1 for the diagonal,
    which stands first in the rows of g = 0; elements that only fill up have sign 0.
    """
    n_irreps = string_first.size - 1
    bounds, length = np.zeros((n_irreps, n_irreps + 1), np.int64), np.zeros((n_irreps, n_irreps), np.int64)
    size = 0
    for g in range(n_irreps):
        for k in range(n_irreps):
            bounds[g, k] = size
            for b in range(string_first[k], string_first[k + 1]):
                length[g, k] = max(length[g, k], first[b, g + 1] - first[b, g] + (g == 0))
            size += (string_first[k + 1] - string_first[k]) * length[g, k]
        bounds[g, n_irreps] = size
    place, rs, signs = np.zeros(size, np.uint32), np.zeros(size, np.int64), np.zeros(size)
    for g in range(n_irreps):
        for k in range(n_irreps):
            for b in range(string_first[k], string_first[k + 1]):
                n = bounds[g, k] + (b - string_first[k]) * length[g, k]
                if g == 0:
                    place[n], rs[n], signs[n] = local[b], -1, 1.0
                    n += 1
                for y in range(first[b, g], first[b, g + 1]):
                    place[n], rs[n], signs[n] = local[end[b, y]], pq[b, y], sign[b, y]
                    n += 1
    return bounds, length, place, rs, signs


@njit(cache=True, nogil=True)
def _fill_values(
    strings: np.ndarray,
    bounds: np.ndarray,
    length: np.ndarray,
    first: np.ndarray,
    rs: np.ndarray,
    sign: np.ndarray,
    pair: np.ndarray,
    values: np.ndarray,
) -> None:
    """values[n - bounds[0]] = sign (pq|rs) of the elements of one irrep of rs; pair: (pq|..), shape (M M,)."""
    m = int(np.sqrt(pair.size))
    begin = bounds[0]
    for n in range(np.uint64(begin), np.uint64(bounds[-1])):
        values[n - np.uint64(begin)] = sign[n] * pair[np.uint64(max(rs[n], 0))]
    if rs.size == 0 or begin >= rs.size or rs[begin] >= 0:
        return
    for k in range(length.size):
        for b in range(first[k], first[k + 1]):
            total, mask, r = 0.0, strings[b], 0
            while mask:
                if mask & np.uint64(1):
                    total += pair[r * (m + 1)]
                mask >>= np.uint64(1)
                r += 1
            values[bounds[k] + (b - first[k]) * length[k] - begin] = total


@njit(cache=True, nogil=True)
def add_pairs(
    vector: np.ndarray,
    out: np.ndarray,
    pair_first: int,
    pair_last: int,
    pair_irrep: np.ndarray,
    irrep: int,
    row_start: np.ndarray,
    row_bounds: np.ndarray,
    row_from: np.ndarray,
    row_to: np.ndarray,
    row_sign: np.ndarray,
    column_strings: np.ndarray,
    column_first: np.ndarray,
    bounds: np.ndarray,
    length: np.ndarray,
    place: np.ndarray,
    rs: np.ndarray,
    sign: np.ndarray,
    integrals: np.ndarray,
) -> None:
    """out += the terms of pairs pair_first..pair_last. integrals: (pq|rs) for p >= q, shape (pairs, M M)."""
    n_irreps = row_bounds.shape[1] - 1
    widest = 0
    for k in range(n_irreps):
        widest = max(widest, column_first[k + 1] - column_first[k])
    source, target = _aligned(widest * LANES), _aligned(widest * LANES)
    most = 0
    for g in range(n_irreps):
        most = max(most, bounds[g, n_irreps] - bounds[g, 0])
    values = np.empty(most)
    starts, ends, signs = np.zeros(LANES, np.int64), np.zeros(LANES, np.int64), np.zeros(LANES)
    for x in range(pair_first, pair_last):
        g = pair_irrep[x]
        places = place[bounds[g, 0] :]
        _fill_values(column_strings, bounds[g], length[g], column_first, rs, sign, integrals[x], values)
        for h in range(n_irreps):
            k_in, k_out = h ^ irrep, h ^ irrep ^ g
            n_in, n_out = column_first[k_in + 1] - column_first[k_in], column_first[k_out + 1] - column_first[k_out]
            if n_in == 0 or n_out == 0:
                continue
            begin, step = bounds[g, k_out] - bounds[g, 0], length[g, k_out]
            y = row_bounds[x, h]
            while y < row_bounds[x, h + 1]:
                count = min(LANES, row_bounds[x, h + 1] - y)
                lanes = 8 if count <= 8 else 16 if count <= 16 else 32
                for lane in range(lanes):
                    z = y + min(lane, count - 1)
                    starts[lane], ends[lane] = row_start[row_from[z]], row_start[row_to[z]]
                    signs[lane] = row_sign[z] if lane < count else 0.0
                _pack(vector, starts, signs, lanes, n_in, source)
                if lanes == 32:
                    for b in range(n_out):
                        multiply_32(begin + b * step, step, places, values, source, target, b)
                elif lanes == 16:
                    for b in range(n_out):
                        multiply_16(begin + b * step, step, places, values, source, target, b)
                else:
                    for b in range(n_out):
                        multiply_8(begin + b * step, step, places, values, source, target, b)
                _unpack(target, ends, lanes, count, n_out, out)
                y += count


@njit(cache=True, nogil=True)
def _aligned(size: int) -> np.ndarray:
    """Uninitialised doubles that begin on a cache line; vectors that straddle two lines load at half the speed."""
    room = np.empty(size + 8)
    return room[(64 - room.ctypes.data % 64) % 64 // 8 :][:size]


@njit(cache=True, nogil=True)
def _pack(vector: np.ndarray, starts: np.ndarray, signs: np.ndarray, lanes: int, width: int, buffer: np.ndarray) -> None:
    whole = width // 8 * 8
    for part in range(0, lanes, 8):
        for c in range(0, whole, 8):
            pack_tile(vector, starts, signs, part, c, lanes, buffer)
        for c in range(whole, width):
            for lane in range(part, part + 8):
                buffer[c * lanes + lane] = signs[lane] * vector[starts[lane] + c]


@njit(cache=True, nogil=True)
def _unpack(buffer: np.ndarray, ends: np.ndarray, lanes: int, count: int, width: int, out: np.ndarray) -> None:
    whole = width // 8 * 8
    for part in range(0, count, 8):
        some = min(8, count - part)
        for c in range(0, whole, 8):
            unpack_tile(buffer, ends, part, c, lanes, some, out)
        for c in range(whole, width):
            for lane in range(part, part + some):
                out[ends[lane] + c] += buffer[c * lanes + lane]
