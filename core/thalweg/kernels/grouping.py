"""Sorting Pauli strings into sets that can be measured together, on bit masks.

Both functions place the strings order[begin:end] and keep their state in the arrays given, so that a long list can be worked
through in pieces. They return the number of sets so far.
"""

from __future__ import annotations

import numpy as np
from numba import njit

from thalweg.arrays import IntArray, MaskArray
from thalweg.kernels.pauli import bit_count

ONE = np.uint64(1)
LETTERS = np.uint64(3)


@njit(cache=True, nogil=True)
def _letters(x: np.uint64, z: np.uint64, columns: MaskArray, others: MaskArray) -> int:
    """Writes 3 q + letter of each qubit of the string, and the same for the two letters that it is not; returns the weight."""
    weight = 0
    rest = x | z
    while rest:
        low = rest & (~rest + ONE)
        q = bit_count(low - ONE)
        letter = (x >> q & ONE) + np.uint64(2) * (z >> q & ONE) - ONE
        columns[weight] = LETTERS * q + letter
        others[0, weight] = LETTERS * q + (letter + ONE) % LETTERS
        others[1, weight] = LETTERS * q + (letter + np.uint64(2)) % LETTERS
        weight += 1
        rest ^= low
    return weight


@njit(cache=True, nogil=True)
def place_qubit_wise(x: MaskArray, z: MaskArray, order: IntArray, begin: int, end: int, group: IntArray, clash: np.ndarray, count: int) -> int:
    """Puts each string into the first set whose letters agree with it on every shared qubit.

    For each letter on each qubit one bit a set tells whether the set holds another letter there: the or of a string's few
    letters shows 64 sets at a time which of them refuse it.

    Args:
        x, z: masks, shape (L,).
        group: receives the set of each string, shape (L,).
        clash: the bits, zero at first, shape (1 + sets // 64 at the end, 3 n), uint64.
    """
    columns, others = np.empty(clash.shape[1], np.uint64), np.empty((2, clash.shape[1]), np.uint64)
    everything = ~np.uint64(0)
    for k in range(begin, end):
        i = np.uint64(order[k])
        weight = _letters(x[i], z[i], columns, others)
        word = np.uint64(0)
        while True:
            refused = np.uint64(0)
            for j in range(weight):
                refused |= clash[word, columns[j]]
            if refused != everything:
                break
            word += ONE
        bit = ~refused & (refused + ONE)  # the lowest zero
        found = np.int64(np.uint64(64) * word + bit_count(bit - ONE))
        group[i] = found
        if found >= count:
            count = int(found) + 1
        for j in range(weight):
            clash[word, others[0, j]] |= bit
            clash[word, others[1, j]] |= bit
    return count


@njit(cache=True, nogil=True)
def place_commuting(
    x: MaskArray, z: MaskArray, order: IntArray, begin: int, end: int, group: IntArray, newest: IntArray, older: IntArray, count: int
) -> int:
    """Puts each string into the first set all of whose members commute with it.

    Args:
        x, z: masks, shape (L,).
        group: receives the set of each string, shape (L,).
        newest: the member of each set that came last, -1 at first, shape (L + 1,).
        older: the member of its set that came before each string, -1 for none, shape (L,).
    """
    for k in range(begin, end):
        i = order[k]
        for g in range(count + 1):
            member = newest[g]
            while member >= 0 and bit_count((x[i] & z[member]) ^ (z[i] & x[member])) & ONE == 0:
                member = older[member]
            if member < 0:
                group[i] = g
                older[i] = newest[g]
                newest[g] = i
                count = max(count, g + 1)
                break
    return count


@njit(cache=True, nogil=True)
def members_of(group: IntArray, chosen: np.ndarray, count: int) -> tuple[IntArray, IntArray]:
    """The chosen strings sorted by set, ascending within a set, and where each set ends, shape (count,)."""
    ends = np.zeros(count + 1, np.int64)
    for i in range(group.size):
        if chosen[i]:
            ends[group[i] + 1] += 1
    for g in range(count):
        ends[g + 1] += ends[g]
    members, at = np.empty(ends[count], np.int64), ends.copy()
    for i in range(group.size):
        if chosen[i]:
            members[at[group[i]]] = i
            at[group[i]] += 1
    return members, ends[1:]
