"""A Pauli sum applied to register vectors, block by block of the low qubits, or through stored matrix rows.

Amplitudes are float64 positions as in `kernels.register` (`unit` 1 for complex, 0 for real). The sum is H = sum_e X^(x_e) D_e with one
entry e for each x mask and parity of the Y count. D_e is diagonal: real values d_e for an even number of Y, i d_e for an odd one. With
each entry hermitian, (H v)[a] = sum_e d_e(a) v[a ^ x_e], times -i for odd.

Within a block of 2^m amplitudes the high bits of a are fixed, and d_e is a real row over the low bits: either the signed sum of a
few stored rows (one for each high part of z), or one Walsh-Hadamard transform of the coefficients placed at the low part of z.

`tables` is (entries, groups, values, rows, least):
    entries (E, 5) int64: x mask, 1 for an odd Y count, first and last group, kind. ROWS: groups are stored rows; TERMS: groups are
        terms; CONSTANT: groups are terms without a low part of z
    groups (G, 2) int64: z mask (of a stored row only the high part counts), and the row number
    values (G,): coefficient with the real part of its phase, unused for rows
    rows (R, 2^m): the first is all 1
    least (1,): smaller elements of a diagonal are rounding errors of zeros
"""

from __future__ import annotations

import numpy as np
from numba import njit

from thalweg.kernels.register_bits import sign
from thalweg.kernels.register_rows import dot_vectors, row_product, walsh_hadamard

TERMS, ROWS, CONSTANT = range(3)


@njit(cache=True, nogil=True)
def diagonal_row(row, entry, high, tables):  # type: ignore[no-untyped-def]
    """Writes the diagonal of an entry for the block with these high bits; returns whether anything in it differs from 0."""
    groups, values, rows, least = tables[1], tables[2], tables[3], tables[4][0]
    row[:] = 0.0
    for g in range(entry[2], entry[3]):
        factor = sign(high & groups[g, 0])
        if entry[4] == ROWS:
            for j in range(row.size):
                row[j] += factor * rows[groups[g, 1], j]
        else:
            row[groups[g, 0] & (row.size - 1)] += factor * values[g]
    if entry[4] != ROWS:
        walsh_hadamard(row)
    for value in row:  # noqa: SIM110 - compiled code takes no generators
        if abs(value) > least:
            return True
    return False


@njit(cache=True, nogil=True)
def whole_row(row, entry, high, tables):  # type: ignore[no-untyped-def]
    """(row to use, factor of it); the factor is 0 where the diagonal vanishes. A single stored row is used where it lies."""
    groups, values, rows = tables[1], tables[2], tables[3]
    if entry[4] == CONSTANT:
        factor = 0.0
        for g in range(entry[2], entry[3]):
            factor += sign(high & groups[g, 0]) * values[g]
        return rows[0], factor
    if entry[4] == ROWS and entry[3] == entry[2] + 1:
        return rows[groups[entry[2], 1]], sign(high & groups[entry[2], 0])
    found = diagonal_row(row, entry, high, tables)
    return row, 1.0 if found else 0.0


@njit(cache=True, nogil=True)
def apply_blocks(vector, out, first_block, last_block, bits, unit, tables):  # type: ignore[no-untyped-def]
    """out <- H vector on the blocks given (positions); returns the real part of that part of <vector|out>."""
    entries, size = tables[0], 1 << bits + unit
    scratch = np.empty(1 << bits)
    total = 0.0
    for block in range(first_block, last_block):
        own = block << bits + unit
        out[own : own + size] = 0.0
        for e in range(entries.shape[0]):
            row, factor = whole_row(scratch, entries[e], block << bits, tables)
            if factor != 0.0:
                x = entries[e, 0]
                other = (block ^ x >> bits) << bits + unit
                mask = (x << unit & size - 1) | entries[e, 1]
                row_product(out, vector, row, (own, other, size), mask, factor, unit, 0)
        total += dot_vectors(vector, out, own, size)
    return total


@njit(cache=True, nogil=True)
def expectation_blocks(vector, first_block, last_block, bits, unit, tables):  # type: ignore[no-untyped-def]
    """The part of <vector|H|vector> that belongs to these blocks; no vector of results is made.

    The amplitudes a and a ^ x give equal parts, so of each pair of blocks that an x mask joins only one is visited.
    """
    entries, size = tables[0], 1 << bits + unit
    scratch = np.empty(1 << bits)
    total = 0.0
    for block in range(first_block, last_block):
        for e in range(entries.shape[0]):
            x = entries[e, 0]
            other = block ^ x >> bits
            if other < block:
                continue
            row, factor = whole_row(scratch, entries[e], block << bits, tables)
            if factor != 0.0:
                mask = (x << unit & size - 1) | entries[e, 1]
                place = (block << bits + unit, other << bits + unit, size)
                part = row_product(vector, vector, row, place, mask, factor, unit, 1)
                total += part if other == block else 2.0 * part
    return total


@njit(cache=True, nogil=True)
def count_stored(first_block, last_block, bits, counts, tables):  # type: ignore[no-untyped-def]
    """Adds to counts[a] the number of matrix elements of row a, for the blocks given."""
    entries, least = tables[0], tables[4][0]
    row = np.empty(1 << bits)
    for block in range(first_block, last_block):
        for e in range(entries.shape[0]):
            if diagonal_row(row, entries[e], block << bits, tables):
                for j in range(row.size):
                    counts[(block << bits) + j] += abs(row[j]) > least


@njit(cache=True, nogil=True)
def fill_stored(first_block, last_block, bits, filled, columns, values, tables):  # type: ignore[no-untyped-def]
    """Writes the matrix elements that `count_stored` counted: values (S, 2) are real and imaginary parts.

    filled[a] is where the next element of row a goes; it moves from the start of the row to its end.
    """
    entries, least = tables[0], tables[4][0]
    row = np.empty(1 << bits)
    for block in range(first_block, last_block):
        for e in range(entries.shape[0]):
            if diagonal_row(row, entries[e], block << bits, tables):
                odd = entries[e, 1]
                for j in range(row.size):
                    if abs(row[j]) > least:
                        a = (block << bits) + j
                        columns[filled[a]] = a ^ entries[e, 0]
                        values[filled[a], odd] = -row[j] if odd else row[j]
                        filled[a] += 1


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
