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
    source: np.ndarray,
    target: np.ndarray,
    row_start: np.ndarray,
    row_irrep: np.ndarray,
    first: np.ndarray,
    irrep: int,
    place: np.ndarray,
    phase: np.ndarray,
) -> None:
    """target[row, c] = phase[c] source[row, place[c]]; place counts within the irrep, columns of irrep k are first[k] to first[k + 1]."""
    for r in range(row_start.size):
        k = row_irrep[r] ^ irrep
        start = np.uint64(row_start[r])
        for c in range(first[k], first[k + 1]):
            target[start + np.uint64(c - first[k])] = phase[c] * source[start + np.uint64(place[c])]


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
    begins in the source.
    """
    tile = 16
    for h in range(row_first.size - 1):
        k = h ^ irrep
        for r0 in range(row_first[h], row_first[h + 1], tile):
            r1 = min(r0 + tile, row_first[h + 1])
            for c0 in range(column_first[k], column_first[k + 1], tile):
                c1 = min(c0 + tile, column_first[k + 1])
                for r in range(r0, r1):
                    at, place, phase = row_start[r] - column_first[k], row_place[r], row_phase[r]
                    for c in range(c0, c1):
                        target[np.uint64(at + c)] = phase * column_phase[c] * source[np.uint64(column_start[c] + place)]


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
