"""What can be said of E(theta) from the program alone: its frequencies, which parameters commute, how steep the gradient may be."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.angles import Angles, angles_of
from thalweg.circuit.axes import axis_triples
from thalweg.circuit.program import Excitation, ExcitationProgram, Gate, GateProgram, Program

#: The energy along one parameter is found from 2 d + 1 values; above this degree no one would.
MAX_DEGREE = 32
#: Factors are multiples of a common one to this accuracy.
RATIO_TOLERANCE = 1e-9


@dataclass(frozen=True)
class Structure:
    """E along one parameter, all others held, is a trigonometric polynomial (Nakanishi et al. 2020; Wierichs et al. 2022).

    Attributes:
        base: lowest frequency of each parameter, shape (K,); the others are its multiples.
        degree: how many multiples there are, shape (K,); 0 where the energy does not depend, -1 where no such form has at most MAX_DEGREE.
        layer: parameters of one number have factors that commute and follow each other, shape (K,).
        triples: parameters (a, b, c) of single-qubit gates R_z(c) R_y(b) R_z(a).
        steepness: bound of |d2E/dtheta_k2| over all parameters and states: (highest frequency)^2 sum |c_l| without the identity
            (Bernstein's inequality), energy unit.
        curvature: estimate of d2E/dtheta_k2 near the reference, shape (K,), energy unit; None where there is none.
    """

    base: FloatArray
    degree: IntArray
    layer: IntArray
    triples: tuple[tuple[int, int, int], ...]
    steepness: float
    curvature: FloatArray | None = None

    @property
    def has_harmonics(self) -> bool:
        return bool(np.all(self.degree >= 0))


def structure_of(program: Program, one_norm: float) -> Structure:
    """`one_norm`: sum |c_l| of the Hamiltonian without its identity."""
    angles = angles_of(program)
    base, degree = _harmonics(angles)
    layer = np.zeros(angles.n_parameters, np.int64)
    numbers = np.array(_layers(program), np.int64)
    layer[angles.parameter[::-1]] = numbers[::-1]  # the first factor of a parameter decides
    triples = axis_triples(program) if isinstance(program, GateProgram) else ()
    return Structure(base, degree, layer, triples, float(angles.widths.max(initial=0.0) ** 2 * one_norm))


def _harmonics(angles: Angles) -> tuple[FloatArray, IntArray]:
    base, degree = np.ones(angles.n_parameters), np.zeros(angles.n_parameters, np.int64)
    weights: list[set[float]] = [set() for _ in range(angles.n_parameters)]
    for k, factor, highest in zip(angles.parameter.tolist(), np.abs(angles.factor).tolist(), angles.highest.tolist(), strict=True):
        if highest and factor:
            weights[k].add(factor)
    for k, found in enumerate(weights):
        if found:
            base[k] = _common_divisor(found)
            count = angles.widths[k] / base[k]
            degree[k] = round(count) if count < MAX_DEGREE + 0.5 else -1
    return base, degree


def _common_divisor(values: set[float]) -> float:
    """The largest number that all are multiples of, by Euclid's algorithm up to rounding."""
    divisor = 0.0
    for value in values:
        a, b = value, divisor
        while b > RATIO_TOLERANCE * value:
            a, b = b, a % b
            b = 0.0 if a - b < RATIO_TOLERANCE * value else b
        divisor = a
    return divisor


def _layers(program: Program) -> list[int]:
    """The layer of each angle: a new one begins where a factor does not commute with the layer, or after a fixed gate."""
    if isinstance(program, ExcitationProgram):
        return _layers_of_excitations(program.excitations)
    return _layers_of_gates(program)


def _layers_of_excitations(excitations: tuple[Excitation, ...]) -> list[int]:
    numbers: list[int] = []
    number, held = 0, 0
    for e in excitations:
        orbitals = _spin_orbitals(e)
        if held & orbitals:
            number, held = number + 1, 0
        held |= orbitals
        numbers.append(number)
    return numbers


def _spin_orbitals(e: Excitation) -> int:
    alpha = sum(1 << 2 * p for p in (*e.alpha_source, *e.alpha_target))
    return alpha | sum(2 << 2 * p for p in (*e.beta_source, *e.beta_target))


def _layers_of_gates(program: GateProgram) -> list[int]:
    numbers: list[int] = []
    number, held = 0, list[tuple[int, int]]()
    for kind, x, z, parameter in zip(program.kind.tolist(), program.x.tolist(), program.z.tolist(), program.parameter.tolist(), strict=True):
        if kind != Gate.ROTATION or parameter < 0:
            number, held = number + bool(held), []
            continue
        if any(((x & b).bit_count() + (z & a).bit_count()) % 2 for a, b in held):
            number, held = number + 1, []
        held.append((x, z))
        numbers.append(number)
    return numbers
