"""Bit masks of occupied orbitals: counts, parities, ranks, and the action of excitations on strings of one spin."""

from __future__ import annotations

from math import comb
from typing import Any

import numpy as np
from numba import njit, types
from numba.extending import intrinsic


@intrinsic
def count_bits(typing_context: Any, mask: Any) -> Any:
    """Number of set bits of a uint64, by the machine's own instruction."""

    def emit(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.ctpop(arguments[0])

    return types.uint64(types.uint64), emit


def binomials(size: int) -> np.ndarray:
    """C(n, k) up to n = size, shape (size + 1, size + 1), int64; what `rank_of` looks up."""
    return np.array([[comb(n, k) for k in range(size + 1)] for n in range(size + 1)], dtype=np.int64)


@njit(cache=True, nogil=True)
def fill_strings(strings: np.ndarray, n_electrons: int) -> None:
    """Fills with the masks of `n_electrons` bits, ascending; the size of the array must be the binomial."""
    one = np.uint64(1)
    mask = (one << np.uint64(n_electrons)) - one
    for i in range(strings.size):
        strings[i] = mask
        if mask == np.uint64(0):
            break
        low = mask & (~mask + one)  # next mask with as many bits (Gosper)
        ripple = mask + low
        mask = (((ripple ^ mask) >> np.uint64(2)) // low) | ripple


@njit(cache=True, nogil=True)
def rank_of(mask: np.uint64, binomial: np.ndarray) -> int:
    """Position of a mask among the ascending masks with as many bits: sum over its bits p_k of C(p_k, k + 1)."""
    rank, k, p = 0, 0, 0
    one = np.uint64(1)
    while mask:
        if mask & one:
            k += 1
            rank += binomial[p, k] if k <= p else 0
        mask >>= one
        p += 1
    return rank


@njit(cache=True, nogil=True)
def excite(mask: np.uint64, source: np.ndarray, target: np.ndarray) -> tuple[np.uint64, int]:
    """E |mask> with E = (a+_t0 a+_t1 ...)(... a_s1 a_s0): the new mask and the sign, 0 where the product vanishes."""
    one = np.uint64(1)
    below = np.uint64(0)
    for k in range(source.size):
        bit = one << np.uint64(source[k])
        if not mask & bit:
            return mask, 0
        below += count_bits(mask & (bit - one))
        mask ^= bit
    for k in range(target.size - 1, -1, -1):
        bit = one << np.uint64(target[k])
        if mask & bit:
            return mask, 0
        below += count_bits(mask & (bit - one))
        mask |= bit
    return mask, 1 - 2 * int(below & one)


@njit(cache=True, nogil=True)
def excitation_pairs(strings: np.ndarray, inverse: np.ndarray, binomial: np.ndarray, source: np.ndarray, target: np.ndarray) -> Any:
    """(from, to, sign) of every string on which the excitation does not vanish, in the order of `strings`.

    strings: (N,) uint64 masks in any order; inverse: (N,) position in `strings` of the mask with each ascending rank.
    """
    start, end, sign = np.empty(strings.size, np.int64), np.empty(strings.size, np.int64), np.empty(strings.size)
    n = 0
    for i in range(strings.size):
        mask, s = excite(strings[i], source, target)
        if s != 0:
            start[n], end[n], sign[n] = i, inverse[rank_of(mask, binomial)], s
            n += 1
    return start[:n].copy(), end[:n].copy(), sign[:n].copy()


@njit(cache=True, nogil=True)
def many_pairs(strings: np.ndarray, inverse: np.ndarray, binomial: np.ndarray, string_first: np.ndarray, orbitals: np.ndarray) -> Any:
    """The pairs of many excitations one after another, each as `excitation_pairs` gives them.

    orbitals: (E, 2, R) source and target orbitals, -1 where there are fewer than R. string_first: (G + 1,), where the strings
    of each irrep begin. Returns first (E, G + 1), the pairs of each excitation by irrep of the first string; start; end; sign.
    """
    one = np.uint64(1)
    n_irreps = string_first.size - 1
    first = np.zeros((orbitals.shape[0], n_irreps + 1), np.int64)
    masks = np.zeros((orbitals.shape[0], 2), np.uint64)
    ranks = np.zeros(orbitals.shape[0], np.int64)
    total = 0
    for e in range(orbitals.shape[0]):
        for side in range(2):
            for p in orbitals[e, side]:
                if p >= 0:
                    masks[e, side] |= one << np.uint64(p)
                    ranks[e] += side
        for h in range(n_irreps):
            first[e, h] = total
            for i in range(string_first[h], string_first[h + 1]):
                total += _is_moved(strings[i], masks[e, 0], masks[e, 1])
        first[e, n_irreps] = total
    start, end, sign = np.empty(total, np.int64), np.empty(total, np.int64), np.empty(total)
    n = 0
    for e in range(orbitals.shape[0]):
        source, target = orbitals[e, 0, : ranks[e]], orbitals[e, 1, : ranks[e]]
        for i in range(strings.size):
            if _is_moved(strings[i], masks[e, 0], masks[e, 1]):
                mask, s = excite(strings[i], source, target)
                start[n], end[n], sign[n] = i, inverse[rank_of(mask, binomial)], s
                n += 1
    return first, start, end, sign


@njit(cache=True, nogil=True)
def _is_moved(mask: np.uint64, source: np.uint64, target: np.uint64) -> bool:
    """Whether all sources are occupied and, once they are empty, all targets are empty too."""
    return mask & source == source and (mask ^ source) & target == np.uint64(0)
