"""A Pauli sum applied to register vectors, block by block of the low qubits, or through stored matrix rows.

The sum is H = sum_e X^(x_e) D_e with one entry e for each x mask and parity of the Y count. D_e is diagonal: real values
d_e for an even number of Y, i d_e for an odd one. With D_e hermitian, (H v)[a] = sum_e d_e(a) v[a ^ x_e], times -i for odd.

Within a block of 2^m amplitudes the high bits h of a are fixed, and d_e is a real row over the low bits: either the signed sum of a
few stored rows (one for each high part of z), or one Walsh-Hadamard transform of the coefficients placed at the low part of z.

Arrays of an operator, in the order in which every kernel takes them:
    entry_x (E,) uint64, entry_odd (E,) bool: x mask, and whether the Y count is odd
    entry_first (E + 1,) int64: groups of entry e are entry_first[e]:entry_first[e + 1]
    entry_stored (E,) bool: whether its groups are stored rows, otherwise single terms
    group_z (G,) uint64: z mask; of a stored row only the high part counts
    group_row (G,) int64: row number, unused for terms
    group_value (G,) float64: coefficient with the real part of its phase, unused for rows
    rows (R, 2^m) float64
"""

from __future__ import annotations

import numpy as np
from numba import njit, uint64

from thalweg.kernels.register_bits import sign


@njit(cache=True, nogil=True)
def walsh_hadamard(values):  # type: ignore[no-untyped-def]
    """In place: values[b] <- sum_z (-1)^popcount(b & z) values[z]; length a power of two."""
    half = uint64(1)
    size = uint64(values.size)
    while half < size:
        for start in range(uint64(0), size, uint64(2) * half):
            for j in range(start, start + half):
                upper, lower = values[j], values[j + half]
                values[j] = upper + lower
                values[j + half] = upper - lower
        half = uint64(2) * half


@njit(cache=True, nogil=True)
def diagonal_row(row, e, high, entry_first, entry_stored, group_z, group_row, group_value, rows):  # type: ignore[no-untyped-def]
    """Writes d_e of the block with these high bits (already shifted into place); returns whether anything in it differs from 0."""
    row[:] = 0.0
    first, last = entry_first[e], entry_first[e + 1]
    if entry_stored[e]:
        for g in range(first, last):
            factor = sign(high & group_z[g])
            source = rows[group_row[g]]
            for j in range(row.size):
                row[j] += factor * source[j]
    else:
        low = uint64(row.size - 1)
        for g in range(first, last):
            row[group_z[g] & low] += sign(high & group_z[g]) * group_value[g]
        walsh_hadamard(row)
    largest = 0.0
    for j in range(row.size):
        largest = max(largest, abs(row[j]))
    return largest > 0.0


@njit(cache=True, nogil=True)
def apply_real(  # type: ignore[no-untyped-def]
    vector, out, first_block, last_block, bits, entry_x, entry_odd, entry_first, entry_stored, group_z, group_row, group_value, rows
):
    """out <- H vector on the blocks given, for real vectors and operators without odd entries; returns that part of <vector|out>."""
    size = 1 << bits
    row = np.empty(size)
    total = 0.0
    for block in range(first_block, last_block):
        base = block << bits
        target = out[base : base + size]
        target[:] = 0.0
        for e in range(entry_x.size):
            if not diagonal_row(row, e, uint64(base), entry_first, entry_stored, group_z, group_row, group_value, rows):
                continue
            x_low = entry_x[e] & uint64(size - 1)
            other = (uint64(base) ^ entry_x[e]) & ~uint64(size - 1)
            source = vector[other : other + uint64(size)]
            for j in range(uint64(size)):
                target[j] += row[j] * source[j ^ x_low]
        own = vector[base : base + size]
        for j in range(size):
            total += own[j] * target[j]
    return total


@njit(cache=True, nogil=True)
def apply_complex(  # type: ignore[no-untyped-def]
    vector, out, first_block, last_block, bits, entry_x, entry_odd, entry_first, entry_stored, group_z, group_row, group_value, rows
):
    """out <- H vector on the blocks given, complex vectors; returns the real part of that part of <vector|out>."""
    size = 1 << bits
    row = np.empty(size)
    total = 0.0
    for block in range(first_block, last_block):
        base = block << bits
        target = out[base : base + size]
        target[:] = 0.0
        for e in range(entry_x.size):
            if not diagonal_row(row, e, uint64(base), entry_first, entry_stored, group_z, group_row, group_value, rows):
                continue
            x_low = entry_x[e] & uint64(size - 1)
            other = (uint64(base) ^ entry_x[e]) & ~uint64(size - 1)
            source = vector[other : other + uint64(size)]
            if entry_odd[e]:
                for j in range(uint64(size)):
                    value = source[j ^ x_low]
                    target[j] += complex(row[j] * value.imag, -row[j] * value.real)
            else:
                for j in range(uint64(size)):
                    target[j] += row[j] * source[j ^ x_low]
        own = vector[base : base + size]
        for j in range(size):
            total += own[j].real * target[j].real + own[j].imag * target[j].imag
    return total


@njit(cache=True, nogil=True)
def expectation_complex(  # type: ignore[no-untyped-def]
    vector, first_block, last_block, bits, entry_x, entry_odd, entry_first, entry_stored, group_z, group_row, group_value, rows
):
    """The part of <vector|H|vector> that belongs to these blocks; no vector of results is made.

    The amplitudes a and a ^ x give equal parts, so of each pair of blocks that an x mask joins only one is visited.
    """
    size = 1 << bits
    row = np.empty(size)
    total = 0.0
    for block in range(first_block, last_block):
        base = block << bits
        own = vector[base : base + size]
        for e in range(entry_x.size):
            other = (uint64(base) ^ entry_x[e]) & ~uint64(size - 1)
            if other < uint64(base):
                continue
            if not diagonal_row(row, e, uint64(base), entry_first, entry_stored, group_z, group_row, group_value, rows):
                continue
            x_low = entry_x[e] & uint64(size - 1)
            source = vector[other : other + uint64(size)]
            part = 0.0
            if entry_odd[e]:
                for j in range(uint64(size)):
                    value = source[j ^ x_low]
                    part += row[j] * (own[j].real * value.imag - own[j].imag * value.real)
            else:
                for j in range(uint64(size)):
                    value = source[j ^ x_low]
                    part += row[j] * (own[j].real * value.real + own[j].imag * value.imag)
            total += part if other == uint64(base) else 2.0 * part
    return total


@njit(cache=True, nogil=True)
def count_stored(first_block, last_block, bits, threshold, counts, entry_x, entry_first, entry_stored, group_z, group_row, group_value, rows):  # type: ignore[no-untyped-def]
    """Adds to counts[a] the number of matrix elements of row a above the threshold, for the blocks given."""
    size = 1 << bits
    row = np.empty(size)
    for block in range(first_block, last_block):
        base = block << bits
        for e in range(entry_x.size):
            if diagonal_row(row, e, uint64(base), entry_first, entry_stored, group_z, group_row, group_value, rows):
                for j in range(size):
                    if abs(row[j]) > threshold:
                        counts[base + j] += 1


@njit(cache=True, nogil=True)
def fill_stored(  # type: ignore[no-untyped-def]
    first_block,
    last_block,
    bits,
    threshold,
    pointers,
    columns,
    values,
    entry_x,
    entry_first,
    entry_stored,
    group_z,
    group_row,
    group_value,
    rows,
):
    """Writes the matrix elements that `count_stored` counted; pointers (2^n + 1,) are the row starts."""
    size = 1 << bits
    row = np.empty(size)
    filled = np.empty(size, dtype=np.int64)
    for block in range(first_block, last_block):
        base = block << bits
        filled[:] = 0
        for e in range(entry_x.size):
            if diagonal_row(row, e, uint64(base), entry_first, entry_stored, group_z, group_row, group_value, rows):
                for j in range(size):
                    if abs(row[j]) > threshold:
                        position = pointers[base + j] + filled[j]
                        columns[position] = uint64(base + j) ^ entry_x[e]
                        values[position] = row[j]
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
