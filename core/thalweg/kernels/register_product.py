"""A Pauli sum applied to register vectors, block by block of the low qubits, or through stored matrix rows.

Amplitudes are float64 positions as in `kernels.register` (`unit` 1 for complex, 0 for real). The sum is H = sum_e X^(x_e) D_e with one
entry e for each x mask and parity of the Y count. D_e is diagonal: real values d_e for an even number of Y, i d_e for an odd one. With
each entry hermitian, (H v)[a] = sum_e d_e(a) v[a ^ x_e], times -i for odd.

Within a block of 2^m amplitudes the high bits of a are fixed, and d_e is a real row over the low bits: either the signed sum of a
few stored rows (one for each high part of z), or one Walsh-Hadamard transform of the coefficients placed at the low part of z.

`tables` is a tuple:
    0 entry_x (E,) uint64      x mask
    1 entry_odd (E,) bool      whether the Y count is odd
    2 entry_first (E + 1,)     groups of entry e are entry_first[e]:entry_first[e + 1]
    3 entry_kind (E,) int64    ROWS: groups are stored rows; TERMS: groups are terms; CONSTANT: terms without low part of z
    4 group_z (G,) uint64      z mask; of a stored row only the high part counts
    5 group_row (G,) int64     row number, unused for terms
    6 group_value (G,)         coefficient with the real part of its phase, unused for rows
    7 rows (R, 2^m)            the first is all 1
    8 least (1,)               smaller elements of a diagonal are rounding errors of zeros
"""

from __future__ import annotations

import numpy as np
from numba import njit, uint64

from thalweg.kernels.register_bits import sign
from thalweg.kernels.register_lanes import dot_vectors, row_product
from thalweg.kernels.register_walsh import walsh_hadamard

TERMS, ROWS, CONSTANT = range(3)


@njit(cache=True, nogil=True)
def diagonal_row(row, e, high, tables):  # type: ignore[no-untyped-def]
    """Writes d_e of the block with these high bits (already in place); returns whether anything in it differs from 0."""
    group_z, least = tables[4], tables[8][0]
    first, last = tables[2][e], tables[2][e + 1]
    row[:] = 0.0
    if tables[3][e] == ROWS:
        for g in range(first, last):
            factor = sign(uint64(high & group_z[g]))
            source = tables[7][tables[5][g]]
            for j in range(row.size):
                row[j] += factor * source[j]
    else:
        low = uint64(row.size - 1)
        for g in range(first, last):
            row[group_z[g] & low] += sign(uint64(high & group_z[g])) * tables[6][g]
        walsh_hadamard(row)
    for value in row:  # noqa: SIM110 - compiled code takes no generators
        if abs(value) > least:
            return True
    return False


@njit(cache=True, nogil=True)
def whole_row(row, e, high, tables):  # type: ignore[no-untyped-def]
    """(row to use, factor of it); the factor is 0 where the diagonal vanishes. A single stored row is used where it lies."""
    first, last, group_z = tables[2][e], tables[2][e + 1], tables[4]
    if tables[3][e] == CONSTANT:
        factor = 0.0
        for g in range(first, last):
            factor += sign(uint64(high & group_z[g])) * tables[6][g]
        return tables[7][0], factor
    if tables[3][e] == ROWS and last == first + 1:
        return tables[7][tables[5][first]], sign(uint64(high & group_z[first]))
    found = diagonal_row(row, e, high, tables)
    return row, 1.0 if found else 0.0


@njit(cache=True, nogil=True)
def apply_blocks(vector, out, first_block, last_block, bits, unit, tables):  # type: ignore[no-untyped-def]
    """out <- H vector on the blocks given (positions); returns the real part of that part of <vector|out>."""
    size = 1 << bits + unit
    scratch = np.empty(1 << bits)
    total = 0.0
    for block in range(first_block, last_block):
        base = uint64(block << bits)
        start = block << bits + unit
        out[start : start + size] = 0.0
        for e in range(tables[0].size):
            row, factor = whole_row(scratch, e, base, tables)
            if factor != 0.0:
                place, mask = places(tables[0][e], tables[1][e], base, bits, unit)
                if unit == 1:
                    row_product(out, vector, row, place, mask, factor, 0, 1)
                else:
                    row_product(out, vector, row, place, mask, factor, 0, 0)
        total += dot_vectors(vector, out, start, size)
    return total


@njit(cache=True, nogil=True)
def expectation_blocks(vector, first_block, last_block, bits, unit, tables):  # type: ignore[no-untyped-def]
    """The part of <vector|H|vector> that belongs to these blocks; no vector of results is made.

    The amplitudes a and a ^ x give equal parts, so of each pair of blocks that an x mask joins only one is visited.
    """
    scratch = np.empty(1 << bits)
    total = 0.0
    for block in range(first_block, last_block):
        base = uint64(block << bits)
        for e in range(tables[0].size):
            other = (base ^ tables[0][e]) >> uint64(bits)
            if other < uint64(block):
                continue
            row, factor = whole_row(scratch, e, base, tables)
            if factor != 0.0:
                place, mask = places(tables[0][e], tables[1][e], base, bits, unit)
                factor *= 1.0 if other == uint64(block) else 2.0
                if unit == 1:
                    total += row_product(vector, vector, row, place, mask, factor, 1, 1)
                else:
                    total += row_product(vector, vector, row, place, mask, factor, 1, 0)
    return total


@njit(cache=True, nogil=True)
def places(x, odd, base, bits, unit):  # type: ignore[no-untyped-def]
    """The `place` and `mask` of `row_product` for the block with this base state."""
    low = (uint64(1) << uint64(bits)) - uint64(1)
    position = np.int64((x & low) << uint64(unit)) | np.int64(odd)
    own = np.int64(base) << unit
    other = np.int64((base ^ x) & ~low) << unit
    return (own, other, np.int64(1) << bits + unit), (position >> 3, position & 7)


@njit(cache=True, nogil=True)
def count_stored(first_block, last_block, bits, counts, tables):  # type: ignore[no-untyped-def]
    """Adds to counts[a] the number of matrix elements of row a, for the blocks given."""
    size = 1 << bits
    row = np.empty(size)
    for block in range(first_block, last_block):
        base = block << bits
        for e in range(tables[0].size):
            if diagonal_row(row, e, uint64(base), tables):
                for j in range(size):
                    if abs(row[j]) > tables[8][0]:
                        counts[base + j] += 1


@njit(cache=True, nogil=True)
def fill_stored(first_block, last_block, bits, pointers, columns, values, tables):  # type: ignore[no-untyped-def]
    """Writes the matrix elements that `count_stored` counted; pointers (2^n + 1,) are the row starts, values have shape (S, 1 or 2)."""
    size = 1 << bits
    row = np.empty(size)
    filled = np.empty(size, dtype=np.int64)
    for block in range(first_block, last_block):
        base = block << bits
        filled[:] = 0
        for e in range(tables[0].size):
            if diagonal_row(row, e, uint64(base), tables):
                for j in range(size):
                    if abs(row[j]) > tables[8][0]:
                        position = pointers[base + j] + filled[j]
                        columns[position] = uint64(base + j) ^ tables[0][e]
                        if tables[1][e]:
                            values[position, 1] = -row[j]
                        else:
                            values[position, 0] = row[j]
                        filled[j] += 1


@njit(cache=True, nogil=True)
def apply_stored(vector, out, first, last, pointers, columns, values):  # type: ignore[no-untyped-def]
    """out <- H vector on rows first:last through the stored matrix, real or complex; returns that part of Re <vector|out>."""
    total = 0.0
    for a in range(first, last):
        value = vector[a] * 0.0
        for k in range(pointers[a], pointers[a + 1]):
            value += values[k] * vector[columns[k]]
        out[a] = value
        total += (np.conj(vector[a]) * value).real
    return total


@njit(cache=True, nogil=True)
def expectation_stored(vector, first, last, pointers, columns, values):  # type: ignore[no-untyped-def]
    """The part of Re <vector|H|vector> that belongs to rows first:last."""
    total = 0.0
    for a in range(first, last):
        value = vector[a] * 0.0
        for k in range(pointers[a], pointers[a + 1]):
            value += values[k] * vector[columns[k]]
        total += (np.conj(vector[a]) * value).real
    return total
