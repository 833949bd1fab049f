"""Orbits of basis states under permutations of the sites and spin inversion, and H between sums over orbits.

Of an orbit with first state r the state of character chi is sum_g conj(chi(g)) g|r>, normalised; it vanishes unless chi is 1 on all
elements that leave r alone (Sandvik, AIP Conference Proceedings 1297, 135 (2010)).
"""

from __future__ import annotations

import numpy as np
from numba import njit, uint64

from thalweg.kernels.spin import parity_sign, rank_state


@njit(cache=True, nogil=True)
def moved(state, tables):  # type: ignore[no-untyped-def]
    """The permuted mask; tables[b, byte] holds where the bits of byte b go."""
    result = uint64(0)
    for b in range(tables.shape[0]):
        result |= tables[b, (state >> uint64(8 * b)) & uint64(255)]
    return result


@njit(cache=True, nogil=True)
def mark_orbits(  # type: ignore[no-untyped-def]
    first, last, count, states, tables, flips, all_ones, bits, offset, rank, orbit_of, element_of, representatives, stabilisers
):
    """Continues the numbering of orbits over the states first:last, ascending; returns the number of orbits so far.

    orbit_of[i] is -1 before its orbit is met. Of each state t of the orbit of r, element_of holds a g with g r = t. stabilisers[o]
    gets a bit for each group element (up to 64) that leaves r alone, which later characters are tested against.
    """
    for i in range(first, last):
        if orbit_of[i] >= 0:
            continue
        r = states[i] if states.size else uint64(i)
        representatives[count] = r
        fixed = uint64(0)
        for g in range(flips.size):
            t = moved(r, tables[g])
            if flips[g]:
                t ^= all_ones
            if t == r:
                fixed |= uint64(1) << uint64(g)
            place = rank_state(t, bits, offset, rank)
            if orbit_of[place] < 0:
                orbit_of[place] = count
                element_of[place] = g
        stabilisers[count] = fixed
        count += 1
    return count


@njit(cache=True, nogil=True)
def group_value(state, e, pointer, z, values):  # type: ignore[no-untyped-def]
    """f_e(state) = sum over the strings of x mask e of value (-1)^popcount(z & state)."""
    total = values[0] * 0.0
    for t in range(pointer[e], pointer[e + 1]):
        total += values[t] * parity_sign(z[t] & state)
    return total


@njit(cache=True, nogil=True)
def count_links(first, last, representatives, x, pointer, z, values, threshold, counts):  # type: ignore[no-untyped-def]
    """counts[o] = number of x masks that act on representative o."""
    for o in range(first, last):
        found = 0
        for e in range(x.size):
            if abs(group_value(representatives[o], e, pointer, z, values)) > threshold:
                found += 1
        counts[o] = found


@njit(cache=True, nogil=True)
def fill_links(  # type: ignore[no-untyped-def]
    first, last, representatives, x, pointer, z, values, threshold, bits, offset, rank, orbit_of, element_of,
    starts, link_orbit, link_element, link_value,
):  # fmt: skip
    """For each representative the orbits that H leads to, with the group element of the state met and the matrix element."""
    for o in range(first, last):
        position = starts[o]
        for e in range(x.size):
            value = group_value(representatives[o], e, pointer, z, values)
            if abs(value) > threshold:
                place = rank_state(representatives[o] ^ x[e], bits, offset, rank)
                link_orbit[position] = orbit_of[place]
                link_element[position] = element_of[place]
                link_value[position] = value
                position += 1


@njit(cache=True, nogil=True)
def block_counts(first, last, kept, starts, link_orbit, number, counts):  # type: ignore[no-untyped-def]
    """counts[i] = links of the i-th surviving orbit kept[i] that end in a surviving orbit (number >= 0)."""
    for i in range(first, last):
        found = 0
        for t in range(starts[kept[i]], starts[kept[i] + 1]):
            if number[link_orbit[t]] >= 0:
                found += 1
        counts[i] = found


@njit(cache=True, nogil=True)
def block_fill(  # type: ignore[no-untyped-def]
    first, last, kept, starts, link_orbit, link_element, link_value, number, root, character, row_start, columns, values
):
    """Rows of H in one symmetry block: <r|H|r'> = conj(f chi(g)) sqrt(|stab r'| / |stab r|), where g r' is the state met from r."""
    for i in range(first, last):
        position = row_start[i]
        for t in range(starts[kept[i]], starts[kept[i] + 1]):
            other = number[link_orbit[t]]
            if other >= 0:
                columns[position] = other
                values[position] = np.conj(link_value[t] * character[link_element[t]]) * (root[other] / root[i])
                position += 1


@njit(cache=True, nogil=True)
def apply_rows(v, out, first, last, diagonal, row_start, columns, values):  # type: ignore[no-untyped-def]
    """out <- H v on rows first:last of a stored matrix with its diagonal apart."""
    for i in range(first, last):
        total = diagonal[i] * v[i]
        for t in range(row_start[i], row_start[i + 1]):
            total += values[t] * v[columns[t]]
        out[i] = total


@njit(cache=True, nogil=True)
def spread_orbits(v, out, first, last, orbit_of, element_of, number, weight, character):  # type: ignore[no-untyped-def]
    """Amplitudes of a block vector on the states first:last, v_r sqrt(|stab| / |G|) conj(chi(g)) on g r; `out` begins as zeros."""
    for i in range(first, last):
        place = number[orbit_of[i]]
        if place >= 0:
            out[i] = v[place] * weight[place] * np.conj(character[element_of[i]])
