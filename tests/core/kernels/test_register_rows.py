"""The vector loops of rows, against plain definitions."""

import numpy as np
import pytest
from scipy.linalg import hadamard

from thalweg.kernels.register_bits import sign
from thalweg.kernels.register_rows import walsh_hadamard


@pytest.mark.parametrize("bits", range(3, 11))
def test_the_transform_is_the_hadamard_matrix(bits):
    values = np.random.default_rng(bits).normal(size=1 << bits)
    expected = hadamard(1 << bits) @ values
    walsh_hadamard(values)
    np.testing.assert_allclose(values, expected, atol=1e-12)


def test_the_transform_of_a_unit_vector_holds_the_signs_of_its_mask():
    values = np.zeros(64)
    values[0b101001] = 1.0
    walsh_hadamard(values)
    np.testing.assert_array_equal(values, [sign(j & 0b101001) for j in range(64)])


def test_signs_count_bits():
    assert [sign(mask) for mask in (0, 1, 3, 7, 2**62 - 1, 2**62)] == [1.0, -1.0, 1.0, -1.0, 1.0, -1.0]
