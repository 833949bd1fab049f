"""Tables of fused diagonal gates: Z-type rotations and controlled Z.

With the fixed qubits of a tile given, a group of diagonal gates is one factor for each amplitude of the tile. It is the product of a
number (gates on fixed qubits alone), a table of the gates on local qubits alone, made once, and a table of the gates that join local
and fixed qubits. The last depends on the tile only through some parities ("keys"); tables for few keys are kept.

`groups` is a tuple of int64 arrays. Group d has the rotations term_first[d]:term_first[d + 1], sorted by local mask:
    0 term_first, 1 term_local (mask on tile bits), 2 term_fixed (mask on the register), 3 term_gate,
    4 pair_first, 5 pair_local, 6 pair_fixed   controlled Z: two bits in all, sorted by local mask
    7 key_first, 8 key_mask                    parities of the base state that the joining table depends on
    9 table_first                              first table row of the group
    10 lasting                                 one number: 1 where tables serve several tiles, 0 where they are made afresh
`work` is (tables (rows, 2 * 2^t) float64 as interleaved complex, made (rows,) bool, moments (2^t,)).
"""

from __future__ import annotations

from numba import njit, uint64

from thalweg.kernels.register_bits import sign

#: Up to this many keys a group keeps a table for each of their values; row 0 of the group is the table of local gates.
KEPT_KEYS = 3


@njit(cache=True, nogil=True)
def phase_table(base, number, groups, work, cosine, sine):  # type: ignore[no-untyped-def]
    """(table row, real and imaginary part of the common factor) for group `number` on the tile with this base state."""
    tables, made = work[0], work[1]
    key_first, key_mask, row = groups[7], groups[8], groups[9][number]
    if not made[row] or not groups[10][0]:
        fill_table(tables[row], number, False, base, groups, cosine, sine)
        made[row] = True
    real, imaginary = common_factor(base, number, groups, cosine, sine)
    keys = key_first[number + 1] - key_first[number]
    if keys == 0:
        return row, real, imaginary
    slot = row + 1
    if keys <= KEPT_KEYS:
        for k in range(keys):
            if sign(uint64(base & key_mask[key_first[number] + k])) < 0.0:
                slot += 1 << k
    if not made[slot] or keys > KEPT_KEYS or not groups[10][0]:
        fill_table(tables[slot], number, True, base, groups, cosine, sine)
        multiply_tables(tables[slot], tables[row])
        made[slot] = True
    return slot, real, imaginary


@njit(cache=True, nogil=True)
def common_factor(base, number, groups, cosine, sine):  # type: ignore[no-untyped-def]
    """The product of the gates that act on fixed qubits alone."""
    factor = 1.0 + 0.0j
    for k in range(groups[0][number], groups[0][number + 1]):
        if groups[1][k] != 0:
            break
        gate = groups[3][k]
        factor *= complex(cosine[gate], -sign(uint64(base & groups[2][k])) * sine[gate])
    for k in range(groups[4][number], groups[4][number + 1]):
        if groups[5][k] != 0:
            break
        if base & groups[6][k] == groups[6][k]:
            factor = -factor
    return factor.real, factor.imag


@njit(cache=True, nogil=True)
def fill_table(table, number, joining, base, groups, cosine, sine):  # type: ignore[no-untyped-def]
    """The table of the gates that are all local (or those joining local and fixed qubits), doubled bit by bit."""
    table[0], table[1] = 1.0, 0.0
    term, last_term = groups[0][number], groups[0][number + 1]
    pair, last_pair = groups[4][number], groups[4][number + 1]
    half = 1
    while 2 * half < table.size:
        for j in range(2 * half):
            table[2 * half + j] = table[j]
        while term < last_term and groups[1][term] < 2 * half:
            local, fixed, gate = groups[1][term], groups[2][term], groups[3][term]
            if local != 0 and (fixed != 0) == joining:
                rotate_halves(table, half, local - half, cosine[gate], sign(uint64(base & fixed)) * sine[gate])
            term += 1
        while pair < last_pair and groups[5][pair] < 2 * half:
            local, fixed = groups[5][pair], groups[6][pair]
            if local != 0 and (fixed != 0) == joining and base & fixed == fixed:
                negate_upper(table, half, local - half)
            pair += 1
        half *= 2


@njit(cache=True, nogil=True)
def rotate_halves(table, half, rest, cosine, sine):  # type: ignore[no-untyped-def]
    """exp(-i angle/2 s) on entries :half with s = (-1)^popcount(j & rest), and its conjugate on half:2 half."""
    for j in range(half):
        turned = sign(uint64(j & rest)) * sine
        real, imaginary = table[2 * j], table[2 * j + 1]
        table[2 * j] = cosine * real + turned * imaginary
        table[2 * j + 1] = cosine * imaginary - turned * real
    for j in range(half, 2 * half):
        turned = -sign(uint64((j - half) & rest)) * sine
        real, imaginary = table[2 * j], table[2 * j + 1]
        table[2 * j] = cosine * real + turned * imaginary
        table[2 * j + 1] = cosine * imaginary - turned * real


@njit(cache=True, nogil=True)
def negate_upper(table, half, rest):  # type: ignore[no-untyped-def]
    """Changes the sign of entries half:2 half that have all bits of `rest`."""
    for j in range(half):
        if j & rest == rest:
            table[2 * (half + j)] = -table[2 * (half + j)]
            table[2 * (half + j) + 1] = -table[2 * (half + j) + 1]


@njit(cache=True, nogil=True)
def multiply_tables(target, other):  # type: ignore[no-untyped-def]
    """target *= other, entry by entry."""
    for j in range(target.size >> 1):
        real, imaginary = target[2 * j], target[2 * j + 1]
        target[2 * j] = real * other[2 * j] - imaginary * other[2 * j + 1]
        target[2 * j + 1] = real * other[2 * j + 1] + imaginary * other[2 * j]
