"""Excitation rotations of a large sector, one view of the amplitudes at a time, and the moves between views.

A view has the strings of one spin as rows and those of the other as columns, sorted by irrep; row r of irrep h begins at
row_start[r] and holds the columns of irrep (total xor h). An excitation of the row spin is a list of row pairs, given by
where the rows begin; one of the column spin is a list of pieces (see `sector_lanes`), cut into chunks whose columns stay
in the cache while all factors of a group pass over them.
"""

from __future__ import annotations

import numpy as np
from numba import njit

from thalweg.kernels.sector_lanes import SUMS, rotate_1, rotate_2, rotate_4, rotate_8, sweep_1, sweep_2, sweep_4, sweep_8


@njit(cache=True, nogil=True)
def rotate_groups(
    psi: np.ndarray,
    irrep: int,
    row_first: np.ndarray,
    row_from: np.ndarray,
    row_to: np.ndarray,
    row_sign: np.ndarray,
    chunk_first: np.ndarray,
    pieces: np.ndarray,
    groups: np.ndarray,
    rows: np.ndarray,
    cosines: np.ndarray,
    sines: np.ndarray,
) -> None:
    """Applies groups of factors in turn.

    row_first: (E, G + 1); row_from, row_to, row_sign: (P,). chunk_first: (C, G, 5), pieces of width 8, 4, 2, 1 of each
    chunk and column irrep. groups: (N, 4), first and last factor, first and last chunk. rows: (F,) excitation of the row
    spin; cosines, sines: (F,).
    """
    n_irreps = row_first.shape[1] - 1
    for n in range(groups.shape[0]):
        for m in range(groups[n, 2], groups[n, 3]):
            for f in range(groups[n, 0], groups[n, 1]):
                e, c = rows[f], cosines[f]
                for h in range(n_irreps):
                    p = chunk_first[m, h ^ irrep]
                    if p[0] == p[4]:
                        continue
                    for x in range(row_first[e, h], row_first[e, h + 1]):
                        i, j, s = row_from[x], row_to[x], sines[f] * row_sign[x]
                        rotate_8(psi, pieces, p[0], p[1], i, j, c, s)
                        rotate_4(psi, pieces, p[1], p[2], i, j, c, s)
                        rotate_2(psi, pieces, p[2], p[3], i, j, c, s)
                        rotate_1(psi, pieces, p[3], p[4], i, j, c, s)


@njit(cache=True, nogil=True)
def sweep_groups(
    psi: np.ndarray,
    dual: np.ndarray,
    irrep: int,
    row_first: np.ndarray,
    row_from: np.ndarray,
    row_to: np.ndarray,
    row_sign: np.ndarray,
    chunk_first: np.ndarray,
    pieces: np.ndarray,
    groups: np.ndarray,
    rows: np.ndarray,
    cosines: np.ndarray,
    sines: np.ndarray,
    out: np.ndarray,
) -> None:
    """Undoes groups of factors on psi and dual, last first, and adds 2 <dual|A_f|psi> to out[f], shape (F,)."""
    n_irreps = row_first.shape[1] - 1
    sums = np.empty(SUMS)
    for n in range(groups.shape[0] - 1, -1, -1):
        for m in range(groups[n, 2], groups[n, 3]):
            for f in range(groups[n, 1] - 1, groups[n, 0] - 1, -1):
                e, c = rows[f], cosines[f]
                sums[:] = 0.0
                for h in range(n_irreps):
                    p = chunk_first[m, h ^ irrep]
                    if p[0] == p[4]:
                        continue
                    for x in range(row_first[e, h], row_first[e, h + 1]):
                        i, j, sign = row_from[x], row_to[x], row_sign[x]
                        s = -sines[f] * sign
                        sweep_8(psi, dual, pieces, p[0], p[1], i, j, c, s, sign, sums, 0)
                        sweep_4(psi, dual, pieces, p[1], p[2], i, j, c, s, sign, sums, 16)
                        sweep_2(psi, dual, pieces, p[2], p[3], i, j, c, s, sign, sums, 24)
                        sweep_1(psi, dual, pieces, p[3], p[4], i, j, c, s, sign, sums, 28)
                total = sums[0:8].sum() - sums[8:16].sum() + sums[16:20].sum() - sums[20:24].sum()
                out[f] += 2.0 * (total + sums[24] + sums[25] - sums[26] - sums[27] + sums[28] - sums[29])


@njit(cache=True, nogil=True)
def permute_columns(
    source: np.ndarray, target: np.ndarray, offsets: np.ndarray, first: np.ndarray, irrep: int, place: np.ndarray, phase: np.ndarray
) -> None:
    """target[row, c] = phase[c] source[row, place[c]], four rows at a time.

    offsets: (G + 1,), where the rows of each irrep begin; first: (G + 1,), columns of each irrep; place counts within the irrep.
    """
    for h in range(offsets.size - 1):
        k = h ^ irrep
        begin, width = first[k], np.uint64(first[k + 1] - first[k])
        if width == 0:
            continue
        at, end = np.uint64(offsets[h]), np.uint64(offsets[h + 1])
        while at + np.uint64(4) * width <= end:
            second, third, fourth = at + width, at + np.uint64(2) * width, at + np.uint64(3) * width
            for c in range(width):
                p, s = np.uint64(place[begin + c]), phase[begin + c]
                target[at + c] = s * source[at + p]
                target[second + c] = s * source[second + p]
                target[third + c] = s * source[third + p]
                target[fourth + c] = s * source[fourth + p]
            at += np.uint64(4) * width
        while at < end:
            for c in range(width):
                target[at + c] = phase[begin + c] * source[at + np.uint64(place[begin + c])]
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
    """Cuts the pairs into pieces, wide ones first; returns where those of width 8, 4, 2, 1 begin and end, shape (5,).

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
    bounds = np.zeros(5, np.int64)
    for w in range(4):
        width = 8 >> w
        for r in range(runs):
            while last[r] - first[r] >= width:
                x = first[r]
                pieces[n] = start[x] | (end[x] << 32) | (np.int64(-1) << 63 if sign[x] < 0.0 else np.int64(0))
                first[r] += width
                n += 1
        bounds[w + 1] = n
    return bounds
