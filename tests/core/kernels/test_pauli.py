"""The mask kernels against plain definitions."""

from __future__ import annotations

import numpy as np
import pytest
from support.dense import annihilators, string_matrix

from thalweg.encoding import ENCODINGS
from thalweg.encoding.linear import linear_encoding
from thalweg.kernels.pauli import encoding_masks, ladder_strings, row_space


def test_random_invertible_matrix_gives_masks_of_itself_and_its_inverse():
    rng = np.random.default_rng(3)
    n = 9
    while True:
        matrix = rng.integers(0, 2, size=(n, n), dtype=np.uint8)
        if round(np.linalg.det(matrix)) % 2:
            break
    update, flip, parity, invertible = encoding_masks(matrix)
    assert invertible
    inverse = np.array([[int(flip[p]) >> q & 1 for q in range(n)] for p in range(n)])
    assert np.array_equal(matrix.astype(int) @ inverse % 2, np.eye(n))
    assert [int(u) for u in update] == [sum(int(matrix[q, p]) << q for q in range(n)) for p in range(n)]
    assert [int(m) for m in parity] == [int(np.bitwise_xor.reduce(flip[:p])) if p else 0 for p in range(n)]


def test_singular_matrix_is_told():
    assert not encoding_masks(np.ones((3, 3), np.uint8))[3]


@pytest.mark.parametrize("kind", list(ENCODINGS), ids=lambda k: k().key)
def test_ladder_products_are_those_of_the_occupation_basis(kind):
    n = 5
    linear = linear_encoding(kind(), n)
    a = annihilators(n)
    place = linear.encode(np.arange(1 << n, dtype=np.uint64)).astype(int)
    for modes, creates in (((3,), (True,)), ((1, 4), (True, False)), ((4, 2, 0, 3), (True, True, False, False)), ((0, 1, 2), (False, True, False))):
        x, z, c = ladder_strings(np.array(modes), np.array(creates), linear.update, linear.flip, linear.parity)
        assert z.size == 1 << len(modes)
        matrix = sum(w * (-1j) ** (int(x) & int(m)).bit_count() * string_matrix(n, int(x), int(m)) for m, w in zip(z, c, strict=True))
        expected = np.eye(1 << n)
        for p, create in zip(modes, creates, strict=True):
            expected = expected @ (a[p].T if create else a[p])
        assert np.allclose(matrix[np.ix_(place, place)], expected, atol=1e-14)


def test_row_space_is_reduced():
    rows = row_space(np.array([0b0110, 0b0110, 0b0011, 0b0101, 0b1000], np.uint64), 4)
    assert rows.tolist() == [0, 0b0011, 0b0101, 0b1000]
    assert row_space(np.zeros(3, np.uint64), 2).tolist() == [0, 0]
