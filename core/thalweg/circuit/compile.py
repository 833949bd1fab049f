"""Excitation factors as Pauli rotations on the register.

The strings of one excitation commute with each other, so that exp(theta (T - T+)) equals the product of their rotations
exactly (Romero et al. 2018).
"""

from __future__ import annotations

import numpy as np

from thalweg.arrays import FloatArray, MaskArray
from thalweg.circuit.program import Excitation, ExcitationProgram, Gate, GateProgram
from thalweg.encoding.encoded import EncodedSystem
from thalweg.encoding.linear import LinearEncoding
from thalweg.encoding.occupations import interleave
from thalweg.encoding.symmetry import Tapering
from thalweg.kernels.pauli import ladder_strings

FULL_REGISTER = "on the full register: an excitation leaves the tapered symmetry sector"


def excitation_gates(program: ExcitationProgram, encoded: EncodedSystem) -> GateProgram:
    """The same state on the working register, up to a global phase; each factor becomes its rotations in ascending (x, z).

    Where an excitation breaks a removed symmetry, the whole program is written on the full register, and `order` says so.
    Factors that vanish on the register, and strings that cancel within a factor, are left out.
    """
    assert encoded.linear is not None
    factors = [generator_strings(excitation, encoded.linear) for excitation in program.excitations]
    tapering, order = encoded.tapering, program.order
    if not all(tapering.keeps(x).all() for x, _, _ in factors):
        tapering = Tapering(encoded.full.n_qubits)
        order = f"{order}; {FULL_REGISTER}" if order else FULL_REGISTER
    tapered = [_on_register(tapering, *factor) for factor in factors]
    counts = [x.size for x, _, _ in tapered]
    weights = np.concatenate([c for _, _, c in tapered] or [np.empty(0)])
    # exp(theta i c P) = exp(-i (-2 c theta)/2 P)
    return GateProgram(
        n_qubits=tapering.n_working,
        reference=_reference(program, encoded.linear, tapering),
        kind=np.full(weights.size, Gate.ROTATION, np.uint8),
        x=np.concatenate([x for x, _, _ in tapered] or [np.empty(0, np.uint64)]),
        z=np.concatenate([z for _, z, _ in tapered] or [np.empty(0, np.uint64)]),
        parameter=np.repeat(np.asarray(program.parameter, np.int64), counts),
        factor=-2.0 * weights * np.repeat(np.asarray(program.factor, float), counts),
        n_parameters=program.n_parameters,
        order=order,
        parameter_labels=program.labels(),
    )


def generator_strings(excitation: Excitation, linear: LinearEncoding) -> tuple[MaskArray, MaskArray, FloatArray]:
    """x, z, c with T - T+ = i sum_j c_j P_j on the full register, shape (2^(2 rank - 1),)."""
    modes = [2 * p for p in excitation.alpha_target] + [2 * p for p in reversed(excitation.alpha_source)]
    modes += [2 * p + 1 for p in excitation.beta_target] + [2 * p + 1 for p in reversed(excitation.beta_source)]
    creates = [True] * len(excitation.alpha_target) + [False] * len(excitation.alpha_source)
    creates += [True] * len(excitation.beta_target) + [False] * len(excitation.beta_source)
    x, z, c = ladder_strings(np.array(modes, np.int64), np.array(creates), linear.update, linear.flip, linear.parity)
    # (X^x Z^z)+ = (-1)^|x&z| X^x Z^z: strings with an odd number of Y survive in T - T+, with X^x Z^z = -i (-1)^((|x&z|-1)/2) P.
    odd = (np.bitwise_count(x & z) & 1).astype(bool)
    z, c = z[odd], c[odd]
    sign = 1.0 - (np.bitwise_count(x & z) & 2)
    return np.full(z.size, x, np.uint64), z, -2.0 * c * sign


def _on_register(tapering: Tapering, x: MaskArray, z: MaskArray, c: FloatArray) -> tuple[MaskArray, MaskArray, FloatArray]:
    """The strings on the working register, equal ones added up, those that cancel left out."""
    x, z, sign = tapering.strings(x, z)
    unique, place = np.unique(z, return_inverse=True)  # one excitation has one x mask
    weights = np.zeros(unique.size)
    np.add.at(weights, place, c * sign)
    keep = np.abs(weights) > 1e-12
    return x[: unique.size][keep], unique[keep], weights[keep]


def _reference(program: ExcitationProgram, linear: LinearEncoding, tapering: Tapering) -> int:
    masks = interleave(np.array(program.reference, np.uint64))
    occupied = masks[0] | masks[1] << np.uint64(1)
    return int(tapering.strip(linear.encode(np.array([occupied], np.uint64)))[0])
