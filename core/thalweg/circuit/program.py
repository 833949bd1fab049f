"""The two kinds of program: excitation factors on a determinant, and gates on a register.

Both are a reference state and an ordered list of factors; the first factor in the list acts first. A factor takes its
angle from one parameter times a fixed number, so that parameters may be shared between factors.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from enum import IntEnum
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray, IntArray, MaskArray
from thalweg.operators.fermion import Sector, WeightedDeterminant


@dataclass(frozen=True)
class Excitation:
    """A spin-conserving excitation T = E_alpha E_beta and its generator A = T - T+.

    E_s = (a+_to[0] a+_to[1] ...)(... a_from[1] a_from[0]) acts on spatial orbitals of one spin; within a spin the
    `source` and `target` orbitals are ascending, distinct, and equal in number. Either spin may be empty (E = 1).
    """

    alpha_source: tuple[int, ...] = ()
    alpha_target: tuple[int, ...] = ()
    beta_source: tuple[int, ...] = ()
    beta_target: tuple[int, ...] = ()

    @property
    def rank(self) -> int:
        """1 for a single, 2 for a double excitation."""
        return len(self.alpha_source) + len(self.beta_source)

    def irrep(self, labels: Sequence[int]) -> int:
        """Irrep of the excitation from those of the orbitals; 0 is totally symmetric."""
        product = 0
        for p in (*self.alpha_source, *self.alpha_target, *self.beta_source, *self.beta_target):
            product ^= labels[p]
        return product

    def label(self) -> str:
        """`2a 3b -> 5a 6b`, orbitals counted from 0 within the active space."""
        source = [f"{p}a" for p in self.alpha_source] + [f"{p}b" for p in self.beta_source]
        target = [f"{p}a" for p in self.alpha_target] + [f"{p}b" for p in self.beta_target]
        return f"{' '.join(source)} -> {' '.join(target)}"


@dataclass(frozen=True)
class ExcitationProgram:
    """|psi> = prod_f exp(factor[f] theta[parameter[f]] A_f) |reference>, real amplitudes in one sector.

    Attributes:
        sector: electrons and orbitals; the state is a real array of shape sector.shape.
        reference: occupied (alpha, beta) masks.
        excitations: F generators; the first acts first.
        parameter, factor: shape (F,).
        n_parameters: K.
        order: one line that states the factor order, recorded with every result.
        parameter_labels: K texts, or empty: then the labels of each parameter's factors are joined.
        reference_terms: where the reference is a normalised combination of determinants; `reference` is one of them.
    """

    sector: Sector
    reference: tuple[int, int]
    excitations: tuple[Excitation, ...]
    parameter: IntArray
    factor: FloatArray
    n_parameters: int
    order: str = ""
    parameter_labels: tuple[str, ...] = ()
    reference_terms: tuple[WeightedDeterminant, ...] = ()

    @property
    def begins(self) -> tuple[WeightedDeterminant, ...]:
        """The state that the first factor acts on."""
        return self.reference_terms or (WeightedDeterminant(1.0, *self.reference),)

    def labels(self) -> tuple[str, ...]:
        """One label a parameter."""
        return self.parameter_labels or _joined(self.n_parameters, self.parameter, [e.label() for e in self.excitations])


class Gate(IntEnum):
    """ROTATION is exp(-i angle/2 P) with P given by (x, z). The others are fixed gates on the qubits named by masks."""

    ROTATION = 0
    CZ = 1  # x: mask of one qubit, z: mask of the other
    CNOT = 2  # x: mask of the control, z: mask of the target
    HADAMARD = 3  # x: mask of the qubit


@dataclass(frozen=True)
class GateProgram:
    """Gates on n qubits; the first acts first.

    Attributes:
        n_qubits: register size.
        reference: bit mask of the computational basis state that the gates act on.
        kind: Gate values, shape (F,), uint8.
        x, z: masks, shape (F,), meaning by kind (see `Gate`).
        parameter: index of the parameter, or -1 where the gate has a fixed angle or none, shape (F,).
        factor: angle = factor * theta[parameter]; for parameter -1 the angle itself (radians), shape (F,).
        n_parameters: K.
    """

    n_qubits: int
    reference: int
    kind: np.ndarray
    x: MaskArray
    z: MaskArray
    parameter: IntArray
    factor: FloatArray
    n_parameters: int
    order: str = ""
    parameter_labels: tuple[str, ...] = field(default=())

    def labels(self) -> tuple[str, ...]:
        return self.parameter_labels or tuple(f"theta{k}" for k in range(self.n_parameters))

    def followed_by(self, kind: Any, x: Any, z: Any, parameter: Any, factor: Any, labels: Sequence[str], order: str = "") -> GateProgram:
        """With these gates after its own: columns of equal length, or one kind for all; `labels` are those of the parameters that are new."""
        kind = np.full(len(x), kind, np.uint8) if np.ndim(kind) == 0 else kind
        return replace(
            self,
            kind=np.concatenate([self.kind, np.asarray(kind, np.uint8)]),
            x=np.concatenate([self.x, np.asarray(x, np.uint64)]),
            z=np.concatenate([self.z, np.asarray(z, np.uint64)]),
            parameter=np.concatenate([self.parameter, np.asarray(parameter, np.int64)]),
            factor=np.concatenate([self.factor, np.asarray(factor, float)]),
            n_parameters=self.n_parameters + len(labels),
            order=order or self.order,
            parameter_labels=(*self.parameter_labels, *labels),
        )


#: kind, x, z, parameter, factor of one gate.
GateRow = tuple[Gate, int, int, int, float]


def gate_program(n_qubits: int, reference: int, rows: Sequence[GateRow] = (), labels: Sequence[str] = (), order: str = "") -> GateProgram:
    """A program from its gates one by one; `labels`: one a parameter."""
    kind, x, z, parameter, factor = zip(*rows, strict=True) if rows else ((),) * 5
    return GateProgram(
        n_qubits=n_qubits,
        reference=reference,
        kind=np.array(kind, np.uint8),
        x=np.array(x, np.uint64),
        z=np.array(z, np.uint64),
        parameter=np.array(parameter, np.int64),
        factor=np.array(factor, float),
        n_parameters=len(labels),
        order=order,
        parameter_labels=tuple(labels),
    )


Program = ExcitationProgram | GateProgram


def _joined(count: int, parameter: IntArray, labels: list[str]) -> tuple[str, ...]:
    parts: list[list[str]] = [[] for _ in range(count)]
    for k, label in zip(parameter.tolist(), labels, strict=True):
        parts[k].append(label)
    return tuple("; ".join(p) for p in parts)
