"""A Pauli expansion made ready to act on vectors of 2^n amplitudes."""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray, MaskArray
from thalweg.kernels import register_product as kernels
from thalweg.kernels.register_rows import walsh_hadamard
from thalweg.operators.pauli import PauliExpansion
from thalweg.parts import allowed_threads, run_parts
from thalweg.watch import SILENT, Watch

#: Qubits of one block: its row of 8 * 2^11 bytes and its amplitudes stay in the second-level cache.
BLOCK_BITS = 11
#: Blocks are at least this large: kernels work on eight numbers at a time.
LEAST_BITS = 3
#: An x mask with at most this many different high parts of z keeps its rows; others transform their coefficients for each block.
MAX_ROWS = 6
#: Bytes that stored rows may take (they must stay in the second-level cache), and that a stored matrix may take.
ROW_BYTES = 2**20
MATRIX_BYTES = 2**26
#: The largest register whose matrix may be stored, and how many of its possible elements may be looked at to find out.
MATRIX_QUBITS = 18
MATRIX_ELEMENTS = 2**26
#: The matrix is stored only where at most this share of its possible elements differs from 0.
SPARSE_SHARE = 0.3
#: Amplitudes times x masks between two looks at the watch: about 5 ms.
PART = 2**22


class ExpansionProduct:
    """H v and <v|H|v> for register vectors, shape (2^n,), float64 or complex128, contiguous.

    A real vector asks for `is_real`, that is for an operator whose strings all have an even number of Y.

    Attributes:
        n_qubits: register size.
        is_real: whether H is a real symmetric matrix.
        memory_bytes: what the prepared tables take.
    """

    def __init__(
        self,
        expansion: PauliExpansion,
        *,
        block_bits: int = BLOCK_BITS,
        row_bytes: int = ROW_BYTES,
        matrix_bytes: int = MATRIX_BYTES,
        threads: int | None = None,
    ) -> None:
        """`threads`: how many share a large vector, by default as many as `parts.allowed_threads` says."""
        self.n_qubits, self._threads = expansion.n_qubits, threads or allowed_threads()
        self._bits = max(LEAST_BITS, min(block_bits, expansion.n_qubits))
        self._tables = _tables(expansion, self._bits, row_bytes)
        self.is_real = not bool(self._tables[0][:, 1].any())
        self._matrix = self._stored_matrix(matrix_bytes)
        tables = self._tables if self._matrix is None else self._tables + self._matrix
        self.memory_bytes = sum(int(table.nbytes) for table in tables)

    def apply(self, vector: Any, out: Any, watch: Watch = SILENT) -> float:
        """Writes H v into `out`, which must not overlap v, and returns Re <v|H v>. Both of one dtype."""
        unit = self._unit(vector)
        if self._matrix is not None:
            return self._walk_rows(lambda first, last, _: kernels.apply_stored(vector, out, first, last, *self._matrix), watch)
        own, image = vector.view(np.float64), out.view(np.float64)
        return self._walk_blocks(lambda first, last, _: kernels.apply_blocks(own, image, first, last, self._bits, unit, self._tables), watch)

    def expectation(self, vector: Any, watch: Watch = SILENT) -> float:
        """<v|H|v> without a second vector."""
        unit = self._unit(vector)
        if self._matrix is not None:
            return self._walk_rows(lambda first, last, _: kernels.expectation_stored(vector, first, last, *self._matrix), watch)
        own = vector.view(np.float64)
        return self._walk_blocks(lambda first, last, _: kernels.expectation_blocks(own, first, last, self._bits, unit, self._tables), watch)

    def _unit(self, vector: Any) -> int:
        if vector.dtype == np.complex128:
            return 1
        if vector.dtype != np.float64:
            raise TypeError(f"vectors are float64 or complex128, not {vector.dtype}")
        if not self.is_real:
            raise TypeError("a real vector needs an operator whose strings all have an even number of Y")
        return 0

    def _walk_blocks(self, part: Any, watch: Watch) -> float:
        cost = max(1, len(self._tables[0])) << self._bits
        return run_parts(part, 1 << (self.n_qubits - self._bits), cost, PART, watch, self._threads)

    def _walk_rows(self, part: Any, watch: Watch) -> float:
        assert self._matrix is not None
        rows = 1 << self.n_qubits
        return run_parts(part, rows, 1 + self._matrix[1].size // rows, PART, watch, self._threads)

    def _stored_matrix(self, matrix_bytes: int) -> tuple[Any, ...] | None:
        """(row starts, columns, values) where the matrix is sparse and small enough, or the register too small for blocks; else None."""
        entries, size, small = len(self._tables[0]), 1 << self.n_qubits, self.n_qubits < LEAST_BITS
        if not small and (self.n_qubits > MATRIX_QUBITS or entries * size > MATRIX_ELEMENTS or not matrix_bytes):
            return None
        blocks = max(1, size >> self._bits)
        counts = np.zeros(max(size, 1 << self._bits), dtype=np.int64)
        kernels.count_stored(0, blocks, self._bits, counts, self._tables)
        stored = int(counts.sum())
        if not small and (stored * 12 > matrix_bytes or stored > SPARSE_SHARE * entries * size):
            return None
        pointers = np.concatenate([[0], np.cumsum(counts)])
        columns, values = np.empty(stored, dtype=np.uint32), np.zeros((stored, 2))
        kernels.fill_stored(0, blocks, self._bits, pointers[:-1].copy(), columns, values, self._tables)
        return pointers, columns, values[:, 0].copy() if self.is_real else values.view(np.complex128)[:, 0].copy()


def product_bytes(expansion: PauliExpansion) -> int:
    """Upper bound of what preparing an `ExpansionProduct` takes, before anything is allocated."""
    terms, size = len(expansion), 1 << expansion.n_qubits
    rows = min(ROW_BYTES, (terms * 8) << min(BLOCK_BITS, expansion.n_qubits))
    if expansion.n_qubits > MATRIX_QUBITS:
        return rows + 64 * terms
    elements = (1.0 if expansion.n_qubits < LEAST_BITS else SPARSE_SHARE) * 2 * np.unique(expansion.x).size * size
    matrix = min(MATRIX_BYTES, 12 * int(elements)) * 3 + 24 * size  # values are written as complex numbers first
    return rows + matrix + 64 * terms


def _tables(expansion: PauliExpansion, bits: int, row_bytes: int) -> tuple[Any, ...]:
    """The arrays that `kernels.register_product` describes."""
    x, z = expansion.x, expansion.z
    y_count = np.bitwise_count(x & z).astype(np.int64)
    odd = (y_count & 1).astype(bool)
    values = expansion.coefficients * np.where(y_count & 2, -1.0, 1.0)  # i^y = (1 or i) times this sign
    low = np.uint64((1 << bits) - 1)
    order = np.lexsort((z & low, z & ~low, odd, x))
    x, z, odd, values = x[order], z[order], odd[order], values[order]
    begins = _changes(x, odd)
    entries: list[tuple[int, ...]] = []
    group_z, group_row, group_value = [], [], []
    rows: list[FloatArray] = [np.ones(1 << bits)]
    n_groups = 0
    for first, last in pairwise(np.append(begins, x.size).tolist()):
        parts = np.append(first + _changes(z[first:last] & ~low), last)
        count = parts.size - 1
        if not np.any(z[first:last] & low):
            kind = kernels.CONSTANT
        else:
            kind = kernels.ROWS if count <= MAX_ROWS and (len(rows) + count) * 8 << bits <= row_bytes else kernels.TERMS
        if kind == kernels.ROWS:
            group_z.append(z[parts[:-1]] & ~low)
            group_row.append(np.arange(len(rows), len(rows) + count))
            group_value.append(np.zeros(count))
            rows += [_row(z[a:b] & low, values[a:b], bits) for a, b in pairwise(parts)]
        else:
            group_z.append(z[first:last])
            group_row.append(np.zeros(last - first, dtype=np.int64))
            group_value.append(values[first:last])
        entries.append((int(x[first]), int(odd[first]), n_groups, n_groups + group_z[-1].size, kind))
        n_groups += group_z[-1].size
    groups = np.stack([_joined(group_z, np.int64), _joined(group_row, np.int64)], axis=1)
    least = np.array([1e-15 * np.abs(values).sum()])
    return np.array(entries, dtype=np.int64).reshape(-1, 5), groups, _joined(group_value, np.float64), np.array(rows), least


def _changes(*keys: Any) -> Any:
    """Positions where any of the sorted keys takes a new value; 0 is one of them."""
    different = np.zeros(keys[0].size, dtype=bool)
    different[:1] = True
    for key in keys:
        different[1:] |= key[1:] != key[:-1]
    return np.flatnonzero(different)


def _row(z_low: MaskArray, values: FloatArray, bits: int) -> FloatArray:
    row = np.zeros(1 << bits)
    row[z_low.astype(np.int64)] = values
    walsh_hadamard(row)
    return row


def _joined(parts: list[Any], dtype: Any) -> Any:
    return np.concatenate(parts).astype(dtype) if parts else np.empty(0, dtype=dtype)
