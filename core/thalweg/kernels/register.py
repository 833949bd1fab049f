"""Gates on register amplitudes, tile by tile, each tile in cache.

Amplitudes are float64 arrays: complex ones as interleaved real and imaginary parts (`unit` 1), real ones plainly (`unit` 0), so that
bit q of a basis state is bit q + unit of a position. In this view -i P of a Pauli string P is a signed permutation B, B^2 = -1, and
exp(-i angle/2 P) = cos(angle/2) + sin(angle/2) B, whether the amplitudes are complex or (for an odd number of Y) real.

A tile holds the 2^t amplitudes that differ in t chosen `local` qubits, among them the lowest c; the other qubits are fixed by the
tile's base state. All gates of a pass flip local qubits only. Every kernel takes one state, or a state and its adjoint state with the
angles negated and the gates in reverse: then gradient[g] += <adjoint|B_g|state> for each rotation g, from the states before its undoing.

Operations are int64 rows; the first column is the kind:
    MIX_THREE  g0 g1 g2 q0 q1 q2   single-qubit Y rotations g, or HADAMARD, or NOTHING, on position bits q >= 3
    MIX_ONE    g q
    MIX_LANES  g0 g1 g2            the same on position bits 0, 1, 2
    TURN       g x z fixed kappa   rotation: position masks x, z, fixed part of its z mask, sign kappa
    PHASES     d any               fused diagonal gates number d; `any` tells whether it holds rotations
    FLIP       control target fixed  CNOT: position masks within the tile, or the control among the fixed qubits
"""

from __future__ import annotations

import numpy as np
from numba import int64, njit, uint64

from thalweg.kernels.register_bits import sign
from thalweg.kernels.register_lanes import copy_vectors, mix_lanes, mix_one, mix_three, multiply_phases, turn
from thalweg.kernels.register_phases import phase_table
from thalweg.kernels.register_walsh import walsh_hadamard

MIX_THREE, MIX_ONE, MIX_LANES, TURN, PHASES, FLIP = range(6)
HADAMARD, NOTHING = -1, -2
#: (-1)^popcount(lane & z) for every z and lane.
LANE_SIGNS = np.array([[(-1.0) ** (z & lane).bit_count() for lane in range(8)] for z in range(8)])


@njit(cache=True, nogil=True)
def matrix_of(gate, cosine, sine):  # type: ignore[no-untyped-def]
    """The real 2 x 2 matrix of a mixing gate, row by row."""
    if gate == HADAMARD:
        return 0.5**0.5, 0.5**0.5, 0.5**0.5, -(0.5**0.5)
    if gate == NOTHING:
        return 1.0, 0.0, 0.0, 1.0
    return cosine[gate], -sine[gate], sine[gate], cosine[gate]


@njit(cache=True, nogil=True)
def turn_range(states, first, last, x, z, cosine, sine):  # type: ignore[no-untyped-def]
    """The rotation with position masks x, z on vector pairs (vectors, where x < 8) first:last; returns <adjoint|B|state>, sign apart."""
    top = int64(1)
    while top << 1 <= x >> 3:
        top <<= 1
    return turn(states, first, last, (x >> 3, z >> 3, top, x & 7), (cosine, sine), LANE_SIGNS[z & 7])


@njit(cache=True, nogil=True)
def flip(state, control, target):  # type: ignore[no-untyped-def]
    """Exchanges positions that differ in the target bit where the control bits are set."""
    for a in range(state.size):
        if a & control == control and not a & target:
            state[a], state[a | target] = state[a | target], state[a]


@njit(cache=True, nogil=True)
def mix(states, size, unit, op, cosine, sine, gradient):  # type: ignore[no-untyped-def]
    """One of the three mixing operations."""
    if op[0] == MIX_ONE:
        dot = mix_one(states, size, int64(1) << op[2], matrix_of(op[1], cosine, sine))
        if op[1] >= 0:
            gradient[op[1]] += dot
        return
    entries = matrix_of(op[1], cosine, sine) + matrix_of(op[2], cosine, sine) + matrix_of(op[3], cosine, sine)
    if op[0] == MIX_THREE:
        dots = mix_three(states, size, (int64(1) << op[4], int64(1) << op[5], int64(1) << op[6]), entries)
    elif unit == 1:
        dots = mix_lanes(states, size, entries, 1)
    else:
        dots = mix_lanes(states, size, entries, 0)
    for k in range(3):
        if op[1 + k] >= 0:
            gradient[op[1 + k]] += dots[k]


@njit(cache=True, nogil=True)
def apply_phases(states, size, unit, base, number, rotations, groups, work, cosine, sine, gradient):  # type: ignore[no-untyped-def]
    """Fused diagonal gates on a tile, and the gradient of those that are rotations."""
    tables, moments = work[0], work[2]
    row, real, imaginary = phase_table(base, number, groups, work, cosine, sine)
    table = tables[row]
    if unit == 0:
        for state in states:
            for j in range(size):
                state[j] *= real * table[2 * j]
        return
    if real == 1.0 and imaginary == 0.0:
        multiply_phases(states, size, table, (real, imaginary), moments, 1)
    else:
        multiply_phases(states, size, table, (real, imaginary), moments, 0)
    if rotations and len(states) == 2:
        term_first, term_local, term_fixed, term_gate = groups[0], groups[1], groups[2], groups[3]
        walsh_hadamard(moments)
        for k in range(term_first[number], term_first[number + 1]):
            gradient[term_gate[k]] += sign(uint64(base & term_fixed[k])) * moments[term_local[k]]


@njit(cache=True, nogil=True)
def run_operations(states, unit, base, operations, groups, work, cosine, sine, gradient):  # type: ignore[no-untyped-def]
    """All operations of a pass on the tile with this base state."""
    size = states[0].size
    for n in range(operations.shape[0]):
        op = operations[n]
        if op[0] <= MIX_LANES:
            mix(states, size, unit, op, cosine, sine, gradient)
        elif op[0] == TURN:
            side = op[5] * sign(uint64(base & op[4]))
            count = size >> 3 if op[2] < 8 else size >> 4
            gradient[op[1]] += side * turn_range(states, 0, count, op[2], op[3], cosine[op[1]], side * sine[op[1]])
        elif op[0] == PHASES:
            apply_phases(states, size, unit, base, op[1], op[2], groups, work, cosine, sine, gradient)
        elif base & op[3] == op[3]:
            for state in states:
                flip(state, op[1], op[2])


@njit(cache=True, nogil=True)
def base_state(tile, fixed):  # type: ignore[no-untyped-def]
    """The bits of the tile number at the positions of the fixed qubits."""
    base = int64(0)
    for k in range(fixed.size):
        base |= (tile >> k & 1) << fixed[k]
    return base


@njit(cache=True, nogil=True)
def run_tiles(  # type: ignore[no-untyped-def]
    states, scratch, first, last, unit, fixed, row_offsets, chunk, operations, groups, work, cosine, sine, gradient
):
    """A pass on tiles first:last.

    states: one or two arrays of 2^n amplitudes; scratch: as many of 2^t, or the states themselves where all qubits are local.
    fixed: positions of the n - t fixed qubits; row_offsets: where in a state the 2^(t - c) rows of `chunk` doubles of a tile lie.
    """
    whole = fixed.size == 0
    for tile in range(first, last):
        base = base_state(tile, fixed)
        if not whole:
            start = base << unit
            for k in range(len(states)):
                for row in range(row_offsets.size):
                    copy_vectors(states[k], start + row_offsets[row], scratch[k], row * chunk, chunk)
        run_operations(scratch, unit, base, operations, groups, work, cosine, sine, gradient)
        if not whole:
            for k in range(len(states)):
                for row in range(row_offsets.size):
                    copy_vectors(scratch[k], row * chunk, states[k], start + row_offsets[row], chunk)
