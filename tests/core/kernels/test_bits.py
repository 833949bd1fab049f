"""Strings of occupied orbitals: enumeration, ranks, signs."""

from __future__ import annotations

from itertools import combinations
from math import comb

import numpy as np
import pytest

from thalweg.kernels.bits import binomials, count_bits, excitation_pairs, excite, fill_strings, rank_of


@pytest.mark.parametrize(("m", "n"), [(1, 0), (1, 1), (5, 2), (6, 6), (9, 4), (62, 1), (62, 61)])
def test_strings_are_ascending_complete_and_ranked(m, n):
    strings = np.zeros(comb(m, n), np.uint64)
    fill_strings(strings, n)
    expected = sorted(sum(1 << p for p in chosen) for chosen in combinations(range(m), n))
    assert strings.tolist() == expected
    table = binomials(m)
    assert [rank_of(mask, table) for mask in strings] == list(range(strings.size))


def test_binomials_are_those_of_pascal():
    table = binomials(20)
    assert all(table[n, k] == comb(n, k) for n in range(21) for k in range(21))


@pytest.mark.parametrize("mask", [0, 1, 0b1011, 2**62 - 1, 2**61])
def test_bits_are_counted(mask):
    from numba import njit

    counted = njit(lambda word: count_bits(word))
    assert counted(np.uint64(mask)) == mask.bit_count()


def sign_by_hand(occupied: list[int], source: tuple[int, ...], target: tuple[int, ...]) -> int:
    """Moves ladder operators through the ordered list of occupied orbitals one by one."""
    sign = 1
    for p in source:
        if p not in occupied:
            return 0
        sign *= (-1) ** occupied.index(p)
        occupied.remove(p)
    for p in reversed(target):
        if p in occupied:
            return 0
        place = sum(q < p for q in occupied)
        sign *= (-1) ** place
        occupied.insert(place, p)
    return sign


@pytest.mark.parametrize(
    ("source", "target"), [((), ()), ((0,), (3,)), ((3,), (1,)), ((2,), (2,)), ((0, 2), (1, 4)), ((1, 3), (1, 4)), ((0, 1), (0, 1))]
)
def test_signs_agree_with_moving_operators_one_by_one(source, target):
    m = 5
    for mask in range(1 << m):
        occupied = [p for p in range(m) if mask >> p & 1]
        new, sign = excite(np.uint64(mask), np.array(source, np.int64), np.array(target, np.int64))
        assert sign == sign_by_hand(list(occupied), source, target)
        if sign:
            assert int(new) == sum(1 << p for p in (set(occupied) - set(source)) | set(target))


def test_pairs_connect_each_string_to_its_image():
    m, n = 6, 3
    strings = np.zeros(comb(m, n), np.uint64)
    fill_strings(strings, n)
    identity = np.arange(strings.size)
    start, end, sign = excitation_pairs(strings, identity, binomials(m), np.array([0]), np.array([4]))
    assert start.size == comb(m - 2, n - 1)
    for i, j, s in zip(start, end, sign, strict=True):
        assert int(strings[j]) == int(strings[i]) ^ 0b10001
        assert s == (-1) ** (int(strings[i]) >> 1 & 0b111).bit_count()
