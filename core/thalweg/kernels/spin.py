"""Spin-1/2 states at fixed magnetisation: ranking, exchange without a matrix, raising.

A basis state is a mask; bit q = 1 is spin down on site q. States with k bits are ranked by splitting the mask into a low
part of `bits` bits and a high part (Lin 1990): rank(s) = offset[high] + rank_low[low]. All states with one high part lie side
by side, ordered by their low part, so that most of H acts within runs that fit the first-level cache.
"""

from __future__ import annotations

import numpy as np
from numba import njit, uint64

from thalweg.kernels.bits import count_bits


@njit(cache=True, nogil=True)
def parity_sign(mask):  # type: ignore[no-untyped-def]
    """+1.0 for an even number of set bits, -1.0 for an odd one."""
    return 1.0 - 2.0 * float(count_bits(mask) & uint64(1))


@njit(cache=True, nogil=True)
def rank_words(bits, rank, start):  # type: ignore[no-untyped-def]
    """For all words of `bits` bits: rank among the words with as many bits set, shape (2^bits,); start[p + 1] counts class p."""
    start[:] = 0
    for word in range(1 << bits):
        p = count_bits(uint64(word))
        rank[word] = start[p + 1]
        start[p + 1] += 1
    for p in range(bits + 1):
        start[p + 1] += start[p]


@njit(cache=True, nogil=True)
def place_runs(high_bits, bits, down, start, offset):  # type: ignore[no-untyped-def]
    """offset[high]: rank of the first state with this high part, -1 where there is none. Returns the dimension."""
    total = 0
    for high in range(1 << high_bits):
        p = down - np.int64(count_bits(uint64(high)))
        if p < 0 or p > bits:
            offset[high] = -1
        else:
            offset[high] = total
            total += start[p + 1] - start[p]
    return total


@njit(cache=True, nogil=True)
def fill_states(states, down, bits, offset, words, start):  # type: ignore[no-untyped-def]
    """All states with `down` bits, ascending. words: the low words sorted by class, class p at start[p]:start[p + 1]."""
    for high in range(offset.size):
        if offset[high] < 0:
            continue
        p = down - np.int64(count_bits(uint64(high)))
        for j in range(start[p + 1] - start[p]):
            states[offset[high] + j] = (uint64(high) << uint64(bits)) | uint64(words[start[p] + j])


@njit(cache=True, nogil=True)
def diagonal_values(out, first, last, states, z, values):  # type: ignore[no-untyped-def]
    """out[i] = sum_l values[l] (-1)^popcount(z[l] & states[i]) for i in first:last."""
    for i in range(first, last):
        total = 0.0
        for t in range(z.size):
            total += values[t] * parity_sign(z[t] & states[i])
        out[i] = total


@njit(cache=True, nogil=True)
def apply_low(v, out, begins, length, row, diagonal, low_pointer, low_column, low_value):  # type: ignore[no-untyped-def]
    """out <- (diagonal + terms within the low part) v on four runs of one class at a time: their rows are read once for all."""
    begin0, begin1, begin2, begin3 = begins
    v0, v1, v2, v3 = v[begin0:], v[begin1:], v[begin2:], v[begin3:]
    for j in range(length):
        total0, total1 = diagonal[begin0 + j] * v0[j], diagonal[begin1 + j] * v1[j]
        total2, total3 = diagonal[begin2 + j] * v2[j], diagonal[begin3 + j] * v3[j]
        for t in range(low_pointer[row + j], low_pointer[row + j + 1]):
            column, value = low_column[t], low_value[t]
            total0 += value * v0[column]
            total1 += value * v1[column]
            total2 += value * v2[column]
            total3 += value * v3[column]
        out[begin0 + j] = total0
        out[begin1 + j] = total1
        out[begin2 + j] = total2
        out[begin3 + j] = total3


@njit(cache=True, nogil=True)
def apply_exchange(  # type: ignore[no-untyped-def]
    v, out, first, last, down, order, offset, start, diagonal, low_pointer, low_column, low_value, high_x, high_value,
    cross_high, cross_half, cross_value, cross_base, cross_pointer, cross_from, cross_to,
):  # fmt: skip
    """out <- H v for the runs of the high parts order[first:last]. Exchange terms flip x where half of its bits are set.

    order: the high parts that have states, sorted by class (number of bits set); a group of fewer than four repeats its last run.
    low_*: rows of the terms within the low part, one row a low word (sorted by class), columns ranked within the class.
    high_*: terms within the high part. cross_*: terms in both; for such a term e with c low bits set the pairs of ranks
    (here, there) of class p are cross_from/to[cross_pointer[cross_base[e] + c, p] : cross_pointer[..., p + 1]].
    """
    i = first
    while i < last:
        p = down - np.int64(count_bits(uint64(order[i])))
        same = 1
        while same < 4 and i + same < last and down - np.int64(count_bits(uint64(order[i + same]))) == p:
            same += 1
        length = start[p + 1] - start[p]
        begins = (offset[order[i]], offset[order[i + min(1, same - 1)]], offset[order[i + min(2, same - 1)]], offset[order[i + same - 1]])
        apply_low(v, out, begins, length, start[p], diagonal, low_pointer, low_column, low_value)
        for high in order[i : i + same]:
            target = out[offset[high] : offset[high] + length]
            for e in range(high_x.size):
                x = high_x[e]
                if uint64(2) * count_bits(uint64(high) & x) == count_bits(x):
                    there = offset[uint64(high) ^ x]
                    source, value = v[there : there + length], high_value[e]
                    for j in range(length):
                        target[j] += value * source[j]
            for e in range(cross_high.size):
                low_set = cross_half[e] - np.int64(count_bits(uint64(high) & cross_high[e]))
                if low_set < 0 or low_set >= cross_base[e + 1] - cross_base[e]:
                    continue
                there = offset[uint64(high) ^ cross_high[e]]
                source, value, line = v[there:], cross_value[e], cross_pointer[cross_base[e] + low_set]
                for t in range(line[p], line[p + 1]):
                    target[cross_from[t]] += value * source[cross_to[t]]
        i += same


@njit(cache=True, nogil=True)
def raise_spin(v, out, first, last, n_sites, states, bits, offset, rank):  # type: ignore[no-untyped-def]
    """out <- S+ v on the states first:last of the sector with one spin down less; offset and rank belong to v's sector."""
    low = (uint64(1) << uint64(bits)) - uint64(1)
    for i in range(first, last):
        total = v[0] * 0.0
        for q in range(n_sites):
            bit = uint64(1) << uint64(q)
            if not states[i] & bit:
                source = states[i] | bit
                total += v[offset[source >> uint64(bits)] + rank[source & low]]
        out[i] = total


@njit(cache=True, nogil=True)
def rank_state(state, bits, offset, rank):  # type: ignore[no-untyped-def]
    """Position of a state; without a ranked basis (offset of length 0) the mask itself."""
    if offset.size == 0:
        return np.int64(state)
    low = (uint64(1) << uint64(bits)) - uint64(1)
    return offset[state >> uint64(bits)] + np.int64(rank[state & low])
