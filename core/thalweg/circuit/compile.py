"""Excitation factors as Pauli rotations on the register.

The strings of one excitation commute with each other, so that exp(theta (T - T+)) equals the product of their rotations
exactly (Romero et al. 2018).
"""

from __future__ import annotations

import numpy as np

from thalweg.arrays import FloatArray, IntArray, MaskArray
from thalweg.circuit.program import Excitation, ExcitationProgram, Gate, GateProgram, gate_program
from thalweg.circuit.sparse_state import preparation
from thalweg.encoding.combination import basis_states
from thalweg.encoding.encoded import EncodedSystem
from thalweg.encoding.linear import LinearEncoding
from thalweg.encoding.symmetry import Tapering
from thalweg.kernels import pauli as kernels

FULL_REGISTER = "on the full register: an excitation or the reference leaves the tapered symmetry sector"


def excitation_gates(program: ExcitationProgram, encoded: EncodedSystem) -> GateProgram:
    """The same state on the working register, up to a global phase; each factor becomes its rotations in ascending (x, z).

    Where an excitation breaks a removed symmetry, the whole program is written on the full register, and `order` says so.
    Factors that vanish on the register, and strings that cancel within a factor, are left out.
    """
    assert encoded.linear is not None
    x, z, weights, factor = generator_strings(program.excitations, encoded.linear)
    tapering, order = encoded.tapering, program.order
    begins = _begins_inside(program, x, encoded)
    if begins is None:
        tapering = Tapering(encoded.full.n_qubits)
        order = f"{order}; {FULL_REGISTER}" if order else FULL_REGISTER
        begins = basis_states(program.begins, encoded.linear, tapering)
        assert begins is not None
    reference, gates = preparation(begins)
    x, z, weights, factor = _on_register(tapering, x, z, weights, factor)
    parameter = np.asarray(program.parameter, np.int64)[factor]
    turns = -2.0 * weights * np.asarray(program.factor, float)[factor]  # exp(theta i c P) = exp(-i (-2 c theta)/2 P)
    fixed = gate_program(tapering.n_working, reference, gates)
    return fixed.followed_by(Gate.ROTATION, x, z, parameter, turns, program.labels(), order)


def leaves_sector(program: ExcitationProgram, encoded: EncodedSystem) -> bool:
    """Whether the tapered register does not hold the state, so that the circuit is written on the full one."""
    assert encoded.linear is not None
    return _begins_inside(program, generator_strings(program.excitations, encoded.linear)[0], encoded) is None


def _begins_inside(program: ExcitationProgram, x: MaskArray, encoded: EncodedSystem) -> dict[int, float] | None:
    """The state that the first factor acts on, on the tapered register; None where that or a string of these x masks leaves it."""
    assert encoded.linear is not None
    return basis_states(program.begins, encoded.linear, encoded.tapering) if encoded.tapering.keeps(x).all() else None


def generator_strings(excitations: tuple[Excitation, ...], linear: LinearEncoding) -> tuple[MaskArray, MaskArray, FloatArray, IntArray]:
    """x, z, c with T - T+ = i sum_j c_j P_j on the full register, and the excitation that each string belongs to."""
    modes: list[int] = []
    creates: list[bool] = []
    ends: list[int] = []
    for e in excitations:
        for spin, source, target in ((0, e.alpha_source, e.alpha_target), (1, e.beta_source, e.beta_target)):
            modes += [2 * p + spin for p in target] + [2 * p + spin for p in reversed(source)]
            creates += [True] * len(target) + [False] * len(source)
        ends.append(len(modes))
    arrays = np.array(modes, np.int64), np.array(creates, bool), np.array(ends, np.int64)
    return kernels.generator_strings(*arrays, linear.update, linear.flip, linear.parity)


def excitation_strings(
    excitations: tuple[Excitation, ...], linear: LinearEncoding, tapering: Tapering
) -> tuple[MaskArray, MaskArray, FloatArray, IntArray]:
    """As `generator_strings` on the working register; excitations that break a removed symmetry have no strings."""
    x, z, c, owner = generator_strings(excitations, linear)
    inside = tapering.keeps(x)
    return _on_register(tapering, x[inside], z[inside], c[inside], owner[inside])


def _on_register(
    tapering: Tapering, x: MaskArray, z: MaskArray, c: FloatArray, factor: IntArray
) -> tuple[MaskArray, MaskArray, FloatArray, IntArray]:
    """The strings on the working register, equal ones of a factor added up, those that cancel left out."""
    x, z, sign = tapering.strings(x, z)
    order = np.lexsort((z, factor))  # one excitation has one x mask
    x, z, c, factor = x[order], z[order], (c * sign)[order], factor[order]
    first = np.ones(z.size, bool)
    first[1:] = (z[1:] != z[:-1]) | (factor[1:] != factor[:-1])
    starts = np.flatnonzero(first)
    summed = np.add.reduceat(c, starts) if starts.size else c
    lasting = np.abs(summed) > 1e-12
    kept = starts[lasting]
    return x[kept], z[kept], summed[lasting], factor[kept]
