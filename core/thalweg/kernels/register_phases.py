"""Tables of fused diagonal gates: Z-type rotations and controlled Z.

With the fixed qubits of a tile given, a group of diagonal gates is one factor for each amplitude of the tile. It is the product of a
number (gates on fixed qubits alone), a table of the gates on local qubits alone, made once, and a table of the gates that join local
and fixed qubits. The last depends on the tile only through some parities ("keys"); tables for few keys are kept.

`groups` is (index, terms, pairs, keys), int64:
    index (D, 8): for group d first and last term, first and last pair, first and last key, first table row, and `lasting`: 1 where
        tables serve several tiles, 0 where they are made afresh
    terms (T, 3): rotations by local mask (tile bits), fixed mask (register bits), gate; each group sorted by local mask
    pairs (P, 2): controlled Z by local and fixed mask, two bits in all; each group sorted by local mask
    keys (Q,): masks of base states whose parities the joining table depends on
`work` is (tables (rows, 2 * 2^t) as interleaved complex, made (rows,) bool, moments (2^t,), `table_scratch()`).
"""

from __future__ import annotations

import numpy as np
from numba import njit

from thalweg.kernels.register_bits import sign
from thalweg.kernels.register_lanes import copy_vectors, multiply_phases, turn
from thalweg.kernels.register_rows import walsh_hadamard

#: Up to this many keys a group keeps a table for each of their values; row 0 of the group is the table of local gates.
KEPT_KEYS = 3


@njit(cache=True, nogil=True)
def phase_table(base, number, groups, work, entries):  # type: ignore[no-untyped-def]
    """(table row, real and imaginary part of the common factor) for group `number` on the tile with this base state."""
    tables, made, moments = work[0], work[1], work[2]
    index, keys = groups[0][number], groups[3]
    real, imaginary = common_factor(base, index, groups, entries)
    count, row = index[5] - index[4], index[6]
    slot = row
    if count > 0:
        slot += 1
        if count <= KEPT_KEYS:
            for k in range(count):
                slot += (1 << k) * (sign(base & keys[index[4] + k]) < 0.0)
    for joining in range(1 + (count > 0)):
        place = slot if joining else row
        if made[place] and index[7] == 1 and not (joining and count > KEPT_KEYS):
            continue
        fill_table(tables[place], joining, base, index, groups, work[3], entries)
        if joining:
            multiply_phases((tables[place], tables[place]), 0, 2 * moments.size, 1, tables[row], (1.0, 0.0), moments)
        made[place] = True
    return slot, real, imaginary


@njit(cache=True, nogil=True)
def product_of_terms(base, first, last, local, joining, terms, entries):  # type: ignore[no-untyped-def]
    """(end, cosine, sine): terms first:end have this local mask; those wanted multiply to exp(-i angle/2 s), s = (-1)^popcount(j & local)."""
    cosine, sine = 1.0, 0.0
    while first < last and terms[first, 0] == local:
        if local == 0 or (terms[first, 1] != 0) == joining:
            gate = terms[first, 2]
            c, s = entries[gate, 0], sign(base & terms[first, 1]) * entries[gate, 2]
            cosine, sine = cosine * c - sine * s, sine * c + cosine * s
        first += 1
    return first, cosine, sine


@njit(cache=True, nogil=True)
def parity_of_pairs(base, first, last, local, joining, pairs):  # type: ignore[no-untyped-def]
    """(end, parity): pairs first:end have this local mask; the parity counts those wanted whose fixed qubits are all 1."""
    parity = 0
    while first < last and pairs[first, 0] == local:
        fixed = pairs[first, 1]
        if (local == 0 or (fixed != 0) == joining) and base & fixed == fixed:
            parity ^= 1
        first += 1
    return first, parity


@njit(cache=True, nogil=True)
def common_factor(base, index, groups, entries):  # type: ignore[no-untyped-def]
    """The product of the gates that act on fixed qubits alone."""
    _, cosine, sine = product_of_terms(base, index[0], index[1], 0, 0, groups[1], entries)
    _, parity = parity_of_pairs(base, index[2], index[3], 0, 0, groups[2])
    side = 1.0 - 2.0 * parity
    return side * cosine, -side * sine


@njit(cache=True, nogil=True)
def fill_table(table, joining, base, index, groups, scratch, entries):  # type: ignore[no-untyped-def]
    """The table of the gates that are all local (or, `joining` 1, those joining local and fixed qubits), doubled bit by bit.

    A gate whose highest local bit is q acts when the table has reached q, so that most gates act on short tables.
    """
    op, own = scratch
    term, pair, entry = index[0], index[2], 8
    for j in range(16):
        table[j] = 1.0 - (j & 1)
    while True:
        while term < index[1] and groups[1][term, 0] < entry:
            local = groups[1][term, 0]
            term, own[0, 0], own[0, 2] = product_of_terms(base, term, index[1], local, joining, groups[1], entries)
            if local != 0 and (own[0, 2] != 0.0 or own[0, 0] != 1.0):
                op[3] = 2 * local + 1
                turn((table, table), 0, (0, entry >> 2), 0, op, own, table)
        while pair < index[3] and groups[2][pair, 0] < entry:
            local = groups[2][pair, 0]
            pair, parity = parity_of_pairs(base, pair, index[3], local, joining, groups[2])
            if local != 0 and parity == 1:
                for j in range(2 * (local & -local), 2 * entry):
                    if (j >> 1) & local == local:
                        table[j] = -table[j]
        if 2 * entry >= table.size:
            return
        copy_vectors(table, 0, table, 2 * entry, 2 * entry)
        entry *= 2


@njit(cache=True, nogil=True)
def phase_slopes(base, index, terms, moments, gradient):  # type: ignore[no-untyped-def]
    """Adds the derivatives of the rotations of a group, from Im(conj(adjoint) state) of each amplitude, which is overwritten."""
    walsh_hadamard(moments)
    for k in range(index[0], index[1]):
        gradient[terms[k, 2]] += sign(base & terms[k, 1]) * moments[terms[k, 0]]


def table_scratch() -> tuple[np.ndarray, np.ndarray]:
    """The scratch part of `work`: a rotation with -i Z, whose positions exchange real and imaginary parts, and its matrix."""
    return np.array([0, 0, 1, 0, 0, 1, 0], dtype=np.int64), np.zeros((1, 4))
