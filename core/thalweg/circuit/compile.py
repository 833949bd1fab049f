"""Excitation factors as Pauli rotations on the register.

The strings of one excitation commute with each other, so that exp(theta (T - T+)) equals the product of their rotations
exactly (Romero et al. 2018).
"""

from __future__ import annotations

import numpy as np

from thalweg.arrays import FloatArray, IntArray, MaskArray
from thalweg.circuit.program import Excitation, ExcitationProgram, Gate, GateProgram
from thalweg.encoding.encoded import EncodedSystem
from thalweg.encoding.linear import LinearEncoding
from thalweg.encoding.occupations import interleave
from thalweg.encoding.symmetry import Tapering
from thalweg.kernels import pauli as kernels

FULL_REGISTER = "on the full register: an excitation leaves the tapered symmetry sector"


def excitation_gates(program: ExcitationProgram, encoded: EncodedSystem) -> GateProgram:
    """The same state on the working register, up to a global phase; each factor becomes its rotations in ascending (x, z).

    Where an excitation breaks a removed symmetry, the whole program is written on the full register, and `order` says so.
    Factors that vanish on the register, and strings that cancel within a factor, are left out.
    """
    assert encoded.linear is not None
    x, z, weights, factor = generator_strings(program.excitations, encoded.linear)
    tapering, order = encoded.tapering, program.order
    if not tapering.keeps(x).all():
        tapering = Tapering(encoded.full.n_qubits)
        order = f"{order}; {FULL_REGISTER}" if order else FULL_REGISTER
    x, z, weights, factor = _on_register(tapering, x, z, weights, factor)
    return GateProgram(
        n_qubits=tapering.n_working,
        reference=_reference(program, encoded.linear, tapering),
        kind=np.full(weights.size, Gate.ROTATION, np.uint8),
        x=x,
        z=z,
        parameter=np.asarray(program.parameter, np.int64)[factor],
        factor=-2.0 * weights * np.asarray(program.factor, float)[factor],  # exp(theta i c P) = exp(-i (-2 c theta)/2 P)
        n_parameters=program.n_parameters,
        order=order,
        parameter_labels=program.labels(),
    )


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


def _reference(program: ExcitationProgram, linear: LinearEncoding, tapering: Tapering) -> int:
    masks = interleave(np.array(program.reference, np.uint64))
    occupied = masks[0] | masks[1] << np.uint64(1)
    return int(tapering.strip(linear.encode(np.array([occupied], np.uint64)))[0])
