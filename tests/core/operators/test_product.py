"""A Pauli expansion acting on vectors, against dense matrices made by Kronecker products."""

import numpy as np
import pytest
from support.dense import expansion_matrix

from thalweg import parts
from thalweg.errors import Stopped
from thalweg.operators.pauli import PauliExpansion, collect_terms
from thalweg.operators.product import ExpansionProduct, product_bytes
from thalweg.watch import Watch


def random_expansion(rng: np.random.Generator, n: int, terms: int, *, real: bool) -> PauliExpansion:
    x, z = (rng.integers(0, 1 << n, terms, dtype=np.uint64) for _ in range(2))
    if real:
        keep = np.bitwise_count(x & z) % 2 == 0
        x, z = x[keep], z[keep]
    return collect_terms(n, x, z, rng.normal(size=x.size))


def random_vector(rng: np.random.Generator, n: int) -> np.ndarray:
    vector = rng.normal(size=1 << n) + 1j * rng.normal(size=1 << n)
    return vector / np.linalg.norm(vector)


@pytest.mark.parametrize("matrix_bytes", [0, 2**20])
@pytest.mark.parametrize("row_bytes", [0, 2**20])
@pytest.mark.parametrize("block_bits", [3, 4, 12])
@pytest.mark.parametrize("real", [False, True])
@pytest.mark.parametrize("n", [1, 2, 4, 6])
def test_product_and_expectation_agree_with_dense_matrices(n, real, block_bits, row_bytes, matrix_bytes):
    rng = np.random.default_rng(n + 10 * block_bits)
    for terms in (1, 5, 60):
        expansion = random_expansion(rng, n, terms, real=real)
        product = ExpansionProduct(expansion, block_bits=block_bits, row_bytes=row_bytes, matrix_bytes=matrix_bytes)
        vector, matrix = random_vector(rng, n), expansion_matrix(expansion)
        out = np.full_like(vector, np.nan)
        value = product.apply(vector, out)
        np.testing.assert_allclose(out, matrix @ vector, atol=1e-12)
        assert value == pytest.approx(np.vdot(vector, matrix @ vector).real, abs=1e-12)
        assert product.expectation(vector) == pytest.approx(value, abs=1e-12)


@pytest.mark.parametrize("matrix_bytes", [0, 2**20])
def test_real_operators_act_on_real_vectors(matrix_bytes):
    rng = np.random.default_rng(3)
    expansion = random_expansion(rng, 5, 80, real=True)
    product = ExpansionProduct(expansion, block_bits=3, matrix_bytes=matrix_bytes)
    vector = rng.normal(size=32)
    out = np.empty(32)
    assert product.is_real
    value = product.apply(vector, out)
    np.testing.assert_allclose(out, expansion_matrix(expansion).real @ vector, atol=1e-12)
    assert product.expectation(vector) == pytest.approx(value, abs=1e-12)


def test_sparse_operators_keep_their_matrix_and_dense_ones_do_not():
    """X0 X1 + Y0 Y1 joins two of four states, and its product with (1 + Z2)(1 + Z3) one of eight states."""
    z = np.array([0, 4, 8, 12], np.uint64)
    sparse = collect_terms(8, np.full(8, 3, np.uint64), np.concatenate([z, z | np.uint64(3)]), np.ones(8))
    field = collect_terms(8, np.uint64(1) << np.arange(8, dtype=np.uint64), np.zeros(8, np.uint64), np.ones(8))
    vector = random_vector(np.random.default_rng(0), 8)
    out = np.empty_like(vector)
    for expansion, kept in ((sparse, True), (field, False)):
        with_matrix, without = ExpansionProduct(expansion), ExpansionProduct(expansion, matrix_bytes=0)
        assert (with_matrix.memory_bytes > without.memory_bytes) == kept
        assert with_matrix.memory_bytes <= product_bytes(expansion)
        with_matrix.apply(vector, out)
        np.testing.assert_allclose(out, expansion_matrix(expansion) @ vector, atol=1e-12)


def test_terms_without_low_z_are_numbers_for_each_block():
    """XX and YY on qubits above the block: one factor that is 0 where the two bits are equal."""
    x, z = np.full(3, 0b110000, np.uint64), np.array([0, 0b110000, 0b001000], np.uint64)
    expansion = collect_terms(6, x, z, np.ones(3))
    product = ExpansionProduct(expansion, block_bits=3, matrix_bytes=0)
    vector = random_vector(np.random.default_rng(4), 6)
    out = np.empty_like(vector)
    assert product.apply(vector, out) == pytest.approx(product.expectation(vector), abs=1e-13)
    np.testing.assert_allclose(out, expansion_matrix(expansion) @ vector, atol=1e-12)


def test_threads_change_nothing(monkeypatch):
    monkeypatch.setattr(parts, "SHARED_FROM", 0)
    rng = np.random.default_rng(6)
    expansion, vector = random_expansion(rng, 7, 90, real=False), random_vector(rng, 7)
    for matrix_bytes in (0, 2**20):
        serial, shared = (ExpansionProduct(expansion, block_bits=3, matrix_bytes=matrix_bytes, threads=n) for n in (1, 3))
        out, other = np.empty_like(vector), np.empty_like(vector)
        assert serial.apply(vector, out) == pytest.approx(shared.apply(vector, other), abs=1e-13)
        np.testing.assert_array_equal(out, other)
        assert serial.expectation(vector) == pytest.approx(shared.expectation(vector), abs=1e-13)


def test_an_odd_number_of_y_refuses_real_vectors():
    product = ExpansionProduct(PauliExpansion(1, np.array([1], np.uint64), np.array([1], np.uint64), np.ones(1)))
    with pytest.raises(TypeError, match="even number of Y"):
        product.apply(np.ones(2), np.empty(2))
    with pytest.raises(TypeError, match="float64 or complex128, not complex64"):
        product.expectation(np.ones(2, np.complex64))


def test_an_empty_expansion_gives_zero():
    nothing = PauliExpansion(2, np.empty(0, np.uint64), np.empty(0, np.uint64), np.empty(0))
    out = np.ones(4, dtype=complex)
    assert ExpansionProduct(nothing).apply(np.ones(4, dtype=complex), out) == 0.0
    assert not out.any()


def test_a_product_can_be_stopped():
    product = ExpansionProduct(random_expansion(np.random.default_rng(1), 4, 20, real=False))
    vector = np.ones(16, dtype=complex)
    with pytest.raises(Stopped):
        product.apply(vector, np.empty_like(vector), Watch(should_stop=lambda: True))
