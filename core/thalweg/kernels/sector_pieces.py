"""Excitation rotations of a large sector, one view of the amplitudes at a time, and the moves between views.

A view has the strings of one spin as rows and those of the other as columns, sorted by irrep; row r of irrep h begins at
row_start[r] and holds the columns of irrep (total xor h). Neighbouring factors with the same excitation of the column spin
form a group. The row pairs that a group turns fall into sets with no row in common; a schedule lists them set by set, and
within a set in the order of the factors, so that a set stays in the cache while all factors act on it. The column
excitation is a list of pieces (see `sector_lanes`), cut into chunks.
"""

from __future__ import annotations

import numpy as np
from numba import njit

from thalweg.kernels.sector_lanes import SUMS, rotate_1, rotate_2, rotate_4, rotate_8, sweep_1, sweep_2, sweep_4, sweep_8


@njit(cache=True, nogil=True)
def rotate_groups(
    psi: np.ndarray,
    irrep: int,
    pair_first: np.ndarray,
    pair_from: np.ndarray,
    pair_to: np.ndarray,
    pair_sign: np.ndarray,
    pair_factor: np.ndarray,
    chunk_first: np.ndarray,
    pieces: np.ndarray,
    groups: np.ndarray,
    cosines: np.ndarray,
    sines: np.ndarray,
) -> None:
    """Applies groups of factors in turn.

    pair_first: (S, G + 1), row pairs of each schedule by irrep of the first row; pair_from, pair_to: where the rows begin;
    pair_factor: factor within the group. chunk_first: (C, G, 9), pieces of width 8, 4, 2, 1 and sign +, - of each chunk and column irrep.
    groups: (N, 4), first factor, schedule, first and last chunk. cosines, sines: (F,).
    """
    for n in range(groups.shape[0]):
        factor, schedule = groups[n, 0], groups[n, 1]
        for m in range(groups[n, 2], groups[n, 3]):
            for h in range(pair_first.shape[1] - 1):
                p = chunk_first[m, h ^ irrep]
                if p[0] == p[8]:
                    continue
                for x in range(pair_first[schedule, h], pair_first[schedule, h + 1]):
                    f = factor + pair_factor[x]
                    i, j, c, s = pair_from[x], pair_to[x], cosines[f], sines[f] * pair_sign[x]
                    rotate_8(psi, pieces, p[0], p[2], i, j, c, s)
                    rotate_4(psi, pieces, p[2], p[4], i, j, c, s)
                    rotate_2(psi, pieces, p[4], p[6], i, j, c, s)
                    rotate_1(psi, pieces, p[6], p[8], i, j, c, s)


@njit(cache=True, nogil=True)
def sweep_groups(
    psi: np.ndarray,
    dual: np.ndarray,
    irrep: int,
    pair_first: np.ndarray,
    pair_from: np.ndarray,
    pair_to: np.ndarray,
    pair_sign: np.ndarray,
    pair_factor: np.ndarray,
    chunk_first: np.ndarray,
    pieces: np.ndarray,
    groups: np.ndarray,
    cosines: np.ndarray,
    sines: np.ndarray,
    out: np.ndarray,
) -> None:
    """Undoes groups of factors on psi and dual, last first, and adds 2 <dual|A_f|psi> to out[f], shape (F,)."""
    sums = np.zeros(SUMS * (out.size + 1))
    for n in range(groups.shape[0] - 1, -1, -1):
        factor, schedule = groups[n, 0], groups[n, 1]
        for m in range(groups[n, 2], groups[n, 3]):
            for h in range(pair_first.shape[1] - 1):
                p = chunk_first[m, h ^ irrep]
                if p[0] == p[8]:
                    continue
                for x in range(pair_first[schedule, h + 1] - 1, pair_first[schedule, h] - 1, -1):
                    f = factor + pair_factor[x]
                    i, j, c, s, slot = pair_from[x], pair_to[x], cosines[f], -sines[f] * pair_sign[x], SUMS * f
                    plus, minus = (0, 1) if pair_sign[x] > 0.0 else (1, 0)
                    sweep_8(psi, dual, pieces, p[0], p[1], i, j, c, s, sums, slot + 8 * plus)
                    sweep_8(psi, dual, pieces, p[1], p[2], i, j, c, -s, sums, slot + 8 * minus)
                    sweep_4(psi, dual, pieces, p[2], p[3], i, j, c, s, sums, slot + 16 + 4 * plus)
                    sweep_4(psi, dual, pieces, p[3], p[4], i, j, c, -s, sums, slot + 16 + 4 * minus)
                    sweep_2(psi, dual, pieces, p[4], p[5], i, j, c, s, sums, slot + 24 + 2 * plus)
                    sweep_2(psi, dual, pieces, p[5], p[6], i, j, c, -s, sums, slot + 24 + 2 * minus)
                    sweep_1(psi, dual, pieces, p[6], p[7], i, j, c, s, sums, slot + 28 + plus)
                    sweep_1(psi, dual, pieces, p[7], p[8], i, j, c, -s, sums, slot + 28 + minus)
    for f in range(out.size):
        total, slot = 0.0, SUMS * f
        for width in (8, 4, 2, 1):
            for lane in range(width):
                total += sums[slot + lane] - sums[slot + width + lane]
            slot += 2 * width
        out[f] += 2.0 * total


@njit(cache=True, nogil=True)
def row_sets(start: np.ndarray, end: np.ndarray, n_rows: int) -> tuple[np.ndarray, np.ndarray]:
    """A number of the set of connected rows that each pair belongs to, shape (P,), and the size of each set, shape (rows,)."""
    parent = np.empty(n_rows, np.int64)
    for r in range(n_rows):
        parent[r] = r
    for x in range(start.size):
        a, b = start[x], end[x]
        while parent[a] != a:
            parent[a] = parent[parent[a]]
            a = parent[a]
        while parent[b] != b:
            parent[b] = parent[parent[b]]
            b = parent[b]
        parent[max(a, b)] = min(a, b)
    sizes = np.zeros(n_rows, np.int64)
    for r in range(n_rows):
        a = r
        while parent[a] != a:
            a = parent[a]
        parent[r] = a
        sizes[a] += 1
    sets = np.empty(start.size, np.int64)
    for x in range(start.size):
        sets[x] = parent[start[x]]
    return sets, sizes


@njit(cache=True, nogil=True)
def cycles_of(place: np.ndarray, phase: np.ndarray, first: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """The permutation new[c] = phase[c] old[place[c]] as cycles; columns that stay are left out.

    place: (N,) counts within the irrep, whose columns are first[k] to first[k + 1]. Returns bounds (G + 1,) of the cycles of each
    irrep, step (C + 1,) where each cycle begins, and column and phase of each step: a column takes the value of the next one.
    """
    seen = np.zeros(place.size, np.bool_)
    bounds, step = np.zeros(first.size, np.int64), np.zeros(place.size + 1, np.int64)
    column, factor = np.empty(place.size, np.int64), np.empty(place.size)
    cycles, n = 0, 0
    for k in range(first.size - 1):
        for c in range(first[k], first[k + 1]):
            if seen[c] or (place[c] == c - first[k] and phase[c] == 1.0):
                continue
            at = c
            while not seen[at]:
                seen[at] = True
                column[n], factor[n] = at - first[k], phase[at]
                n += 1
                at = first[k] + place[at]
            cycles += 1
            step[cycles] = n
        bounds[k + 1] = cycles
    return bounds, step[: cycles + 1].copy(), column[:n].copy(), factor[:n].copy()


@njit(cache=True, nogil=True)
def permute_columns(
    psi: np.ndarray, offsets: np.ndarray, widths: np.ndarray, irrep: int, bounds: np.ndarray, step: np.ndarray, column: np.ndarray, factor: np.ndarray
) -> None:
    """Carries out a permutation of columns, given by `cycles_of`, in place, four rows at a time.

    offsets: (G + 1,), where the rows of each irrep begin; widths: (G,), their lengths.
    """
    for h in range(widths.size):
        k, width = h ^ irrep, np.uint64(widths[h])
        if width == np.uint64(0):
            continue
        at, end = np.uint64(offsets[h]), np.uint64(offsets[h + 1])
        second, third, fourth = width, np.uint64(2) * width, np.uint64(3) * width
        while at + np.uint64(4) * width <= end:
            for cycle in range(bounds[k], bounds[k + 1]):
                n, last = np.uint64(step[cycle]), np.uint64(step[cycle + 1] - 1)
                here = at + np.uint64(column[n])
                u, v, w, x = psi[here], psi[here + second], psi[here + third], psi[here + fourth]
                while n < last:
                    following, s = at + np.uint64(column[n + np.uint64(1)]), factor[n]
                    psi[here], psi[here + second] = s * psi[following], s * psi[following + second]
                    psi[here + third], psi[here + fourth] = s * psi[following + third], s * psi[following + fourth]
                    here = following
                    n += np.uint64(1)
                s = factor[n]
                psi[here], psi[here + second], psi[here + third], psi[here + fourth] = s * u, s * v, s * w, s * x
            at += np.uint64(4) * width
        while at < end:
            for cycle in range(bounds[k], bounds[k + 1]):
                n, last = np.uint64(step[cycle]), np.uint64(step[cycle + 1] - 1)
                here = at + np.uint64(column[n])
                u = psi[here]
                while n < last:
                    following = at + np.uint64(column[n + np.uint64(1)])
                    psi[here] = factor[n] * psi[following]
                    here = following
                    n += np.uint64(1)
                psi[here] = factor[n] * u
            at += width


@njit(cache=True, nogil=True)
def transpose(
    source: np.ndarray,
    target: np.ndarray,
    irrep: int,
    row_first: np.ndarray,
    row_start: np.ndarray,
    row_place: np.ndarray,
    row_phase: np.ndarray,
    column_first: np.ndarray,
    column_start: np.ndarray,
    column_phase: np.ndarray,
) -> None:
    """target[r, c] = row_phase[r] column_phase[c] source[column_start[c] + row_place[r]], in tiles that stay in the cache.

    row_place: column that the row string has in the source, within its irrep; column_start: where the column string's row
    begins in the source. Four rows are written at a time.
    """
    tile = 32
    for h in range(row_first.size - 1):
        k = h ^ irrep
        c_first, c_last = np.uint64(column_first[k]), np.uint64(column_first[k + 1])
        for c0 in range(c_first, c_last, np.uint64(tile)):
            c1 = min(c0 + np.uint64(tile), c_last)
            r = row_first[h]
            while r + 4 <= row_first[h + 1]:
                at, at2 = np.uint64(row_start[r]) - c_first, np.uint64(row_start[r + 1]) - c_first
                at3, at4 = np.uint64(row_start[r + 2]) - c_first, np.uint64(row_start[r + 3]) - c_first
                p, p2, p3, p4 = np.uint64(row_place[r]), np.uint64(row_place[r + 1]), np.uint64(row_place[r + 2]), np.uint64(row_place[r + 3])
                s, s2, s3, s4 = row_phase[r], row_phase[r + 1], row_phase[r + 2], row_phase[r + 3]
                for c in range(c0, c1):
                    begin, phase = np.uint64(column_start[c]), column_phase[c]
                    target[at + c] = s * phase * source[begin + p]
                    target[at2 + c] = s2 * phase * source[begin + p2]
                    target[at3 + c] = s3 * phase * source[begin + p3]
                    target[at4 + c] = s4 * phase * source[begin + p4]
                r += 4
            while r < row_first[h + 1]:
                at = np.uint64(row_start[r]) - c_first
                for c in range(c0, c1):
                    target[at + c] = row_phase[r] * column_phase[c] * source[np.uint64(column_start[c] + row_place[r])]
                r += 1


@njit(cache=True, nogil=True)
def cut_pieces(start: np.ndarray, end: np.ndarray, sign: np.ndarray, first: np.ndarray, last: np.ndarray, pieces: np.ndarray) -> np.ndarray:
    """Cuts the pairs into pieces, wide ones first; returns where those of width 8, 4, 2, 1 and sign +, - begin and end, shape (9,).

    start, end, sign: (P,), start ascending. first, last: (P,) scratch. pieces: (P,) int64, filled. Runs in which both
    places grow by one and the sign stays become pieces of 8, 4, 2 and 1.
    """
    runs = 0
    for x in range(start.size):
        if runs and start[x] == start[x - 1] + 1 and end[x] == end[x - 1] + 1 and sign[x] == sign[x - 1]:
            last[runs - 1] = x + 1
        else:
            first[runs], last[runs] = x, x + 1
            runs += 1
    n = 0
    bounds = np.zeros(9, np.int64)
    for w in range(4):
        width = 8 >> w
        for minus in range(2):
            for r in range(runs):
                if (sign[first[r]] < 0.0) != (minus == 1) or last[r] - first[r] < width:
                    continue
                x = first[r]
                while last[r] - x >= width:
                    pieces[n] = start[x] | (end[x] << 32) | (np.int64(-1) << 63 if minus else np.int64(0))
                    x += width
                    n += 1
                if x < last[r]:
                    first[r] = x
                else:
                    last[r] = first[r]
            bounds[2 * w + minus + 1] = n
    return bounds
