"""Gates on register amplitudes, tile by tile, each tile in cache.

Amplitudes are float64 arrays: complex ones as interleaved real and imaginary parts (`unit` 1), real ones plainly (`unit` 0), so that
bit q of a basis state is bit q + unit of a position. In this view -i P of a Pauli string P is a signed permutation B, B^2 = -1, and
exp(-i angle/2 P) = cos(angle/2) + sin(angle/2) B, whether the amplitudes are complex or (for an odd number of Y) real.

A tile holds the 2^t amplitudes that differ in t chosen `local` qubits, among them the lowest ones; the other qubits are fixed by the
tile's base state. All gates of a pass flip local qubits only. Passes take a state and its adjoint state and act on the first alone, or
(`both` 1, with negated angles and the gates in reverse) on both, and then add <adjoint|B_g|state> to gradient[g] for each rotation g.

Operations are int64 rows; the first column is the kind. Gates are numbers of rows in `entries`, see `kernels.register_lanes`:
    MIX_THREE  g0 g1 g2 q0 q1 q2     single-qubit gates with real matrices on the position bits q >= 3, ascending
    MIX_ONE    g q
    MIX_LANES  g0 g1 g2 idle         the same on the position bits 0, 1, 2; `idle` 1: nothing happens on bit 0
    TURN       g x z fixed kappa     rotation: position masks x, z, fixed part of its z mask, sign kappa
    PHASES     d rotations           fused diagonal gates number d, see `kernels.register_phases`; whether it holds rotations
    FLIP       control target fixed  CNOT: position masks within the tile, or the control among the fixed qubits
"""

from __future__ import annotations

from numba import int64, njit

from thalweg.kernels.register_lanes import copy_vectors, mix_lanes, mix_one, mix_three, multiply_phases, turn
from thalweg.kernels.register_phases import phase_slopes, phase_table

MIX_THREE, MIX_ONE, MIX_LANES, TURN, PHASES, FLIP = range(6)


@njit(cache=True, nogil=True)
def flip(state, size, control, target):  # type: ignore[no-untyped-def]
    """Exchanges positions that differ in the target bit where the control bits are set."""
    for a in range(size):
        if a & control == control and not a & target:
            state[a], state[a | target] = state[a | target], state[a]


@njit(cache=True, nogil=True)
def turn_parts(states, both, first, last, op, entries, gradient):  # type: ignore[no-untyped-def]
    """A single TURN on states as a whole, vector pairs (vectors, for x < 8) first:last."""
    turn(states, both, (first, last), 0, op, entries, gradient)


@njit(cache=True, nogil=True)
def run_tiles(  # type: ignore[no-untyped-def]
    states, scratch, both, first, last, unit, fixed, offsets, chunk, operations, groups, work, entries, gradient
):
    """A pass on tiles first:last.

    states: two arrays of 2^n amplitudes; scratch: two of 2^t, or the states themselves where all qubits are local.
    fixed: positions of the n - t fixed qubits; offsets: where in a state the rows of `chunk` positions of a tile lie.
    One function, because each compiled function that contains another is optimised with it once more.
    """
    size, moments = offsets.size * chunk, work[2]
    for tile in range(first, last):
        base = int64(0)
        for k in range(fixed.size):
            base |= (tile >> k & 1) << fixed[k]
        if fixed.size > 0:
            for k in range(both + 1):
                for row in range(offsets.size):
                    copy_vectors(states[k], (base << unit) + offsets[row], scratch[k], row * chunk, chunk)
        for n in range(operations.shape[0]):
            op = operations[n]
            if op[0] == MIX_THREE:
                mix_three(scratch, both, size, op, entries, gradient)
            elif op[0] == MIX_ONE:
                mix_one(scratch, both, size, op, entries, gradient)
            elif op[0] == MIX_LANES:
                mix_lanes(scratch, both, size, op, entries, gradient)
            elif op[0] == TURN:
                turn(scratch, both, (0, size >> 3 if op[2] < 8 else size >> 4), base, op, entries, gradient)
            elif op[0] == PHASES:
                place, real, imaginary = phase_table(base, op[1], groups, work, entries)
                multiply_phases(scratch, both, size, unit, work[0][place], (real, imaginary), moments)
                if both == 1 and op[2] == 1:
                    phase_slopes(base, groups[0][op[1]], groups[1], moments, gradient)
            elif base & op[3] == op[3]:
                for k in range(both + 1):
                    flip(scratch[k], size, op[1], op[2])
        if fixed.size > 0:
            for k in range(both + 1):
                for row in range(offsets.size):
                    copy_vectors(scratch[k], row * chunk, states[k], (base << unit) + offsets[row], chunk)
