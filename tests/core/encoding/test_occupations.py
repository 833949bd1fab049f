"""Determinants: interleaved masks, order signs against the definition, and their text."""

from __future__ import annotations

import numpy as np
import pytest
from support.dense import annihilators

from thalweg.encoding.occupations import alpha_beta_masks, determinant_masks, interleave, occupation_text, orbital_list, order_signs
from thalweg.operators.fermion import Sector


@pytest.mark.parametrize(("m", "n_alpha", "n_beta"), [(3, 2, 1), (3, 1, 3), (2, 0, 2), (3, 2, 2)])
def test_order_signs_follow_from_the_operators(m, n_alpha, n_beta):
    a = annihilators(2 * m)
    alpha, beta = determinant_masks(Sector(m, n_alpha, n_beta))
    signs = order_signs(alpha, beta)
    for i, left in enumerate(alpha.tolist()):
        for j, right in enumerate(beta.tolist()):
            state = np.eye(1 << 2 * m)[0]
            operators = [a[2 * p].T for p in range(m) if left >> p & 1] + [a[2 * p + 1].T for p in range(m) if right >> p & 1]
            for operator in reversed(operators):
                state = operator @ state
            index = int(interleave(np.array([left], np.uint64))[0]) | int(interleave(np.array([right], np.uint64))[0]) << 1
            assert state[index] == signs[i, j]


def test_determinants_are_ascending_and_complete():
    alpha, beta = determinant_masks(Sector(5, 2, 0))
    assert alpha.tolist() == sorted(m for m in range(32) if m.bit_count() == 2)
    assert beta.tolist() == [0]


def test_masks_interleave_and_part_again():
    masks = np.array([0, 1, 0b101, (1 << 31) - 1], np.uint64)
    for mask, wide in zip(masks.tolist(), interleave(masks).tolist(), strict=True):
        assert alpha_beta_masks(wide) == (mask, 0)
        assert alpha_beta_masks(wide << 1) == (0, mask)


def test_texts_name_occupations():
    assert occupation_text(0b0011, 0b0101, Sector(4, 2, 2)) == "2a b0"
    assert occupation_text(0b11, 0b01, Sector(2, 2, 1)) == "2a"
    assert occupation_text(0, 0, Sector(2, 0, 0)) == "00"
    assert orbital_list(0b110010) == "0b 2a 2b"
