"""The angles of a program one by one: a device shifts one gate at a time, also where gates share a parameter."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import ExcitationProgram, Gate, GateProgram, Program

#: Highest frequency of the energy in the angle of exp(-i angle/2 P), and of exp(angle (T - T+)), whose generator has the
#: eigenvalues -1, 0 and 1; a factor that is the identity has none.
ROTATION, EXCITATION, IDENTITY = 1, 2, 0


@dataclass(frozen=True)
class Angles:
    """angle[a] = factor[a] theta[parameter[a]] for the gates of a program that a parameter turns.

    Attributes:
        parameter, factor: shape (A,).
        highest: highest frequency of the energy in each angle: ROTATION, EXCITATION or IDENTITY, shape (A,).
        n_parameters: K.
    """

    parameter: IntArray
    factor: FloatArray
    highest: IntArray
    n_parameters: int

    def of(self, parameters: FloatArray) -> FloatArray:
        """Angles, shape (A,)."""
        if self.parameter.size == 0:
            return np.empty(0)
        angles: FloatArray = self.factor * np.asarray(parameters, float)[self.parameter]
        return angles

    def to_parameters(self, by_angle: FloatArray) -> FloatArray:
        """Derivatives by angle, shape (A,), summed into derivatives by parameter, shape (K,)."""
        summed: FloatArray = np.bincount(self.parameter, weights=self.factor * by_angle, minlength=self.n_parameters).astype(float)
        return summed

    @cached_property
    def widths(self) -> FloatArray:
        """Highest frequency of the energy in each parameter, shape (K,): that of all its angles together."""
        sums: FloatArray = np.bincount(self.parameter, weights=np.abs(self.factor) * self.highest, minlength=self.n_parameters).astype(float)
        return sums


def angles_of(program: Program) -> Angles:
    """The angles that parameters set, in order of action."""
    if isinstance(program, ExcitationProgram):
        null = [e.alpha_source == e.alpha_target and e.beta_source == e.beta_target for e in program.excitations]
        highest = np.where(np.array(null, bool), IDENTITY, EXCITATION).astype(np.int64)
        return Angles(np.asarray(program.parameter, np.int64), np.asarray(program.factor, float), highest, program.n_parameters)
    live = _turned(program)
    strings = (program.x | program.z)[live] != 0
    return Angles(program.parameter[live], program.factor[live], np.where(strings, ROTATION, IDENTITY).astype(np.int64), program.n_parameters)


def one_parameter_an_angle(program: Program) -> Program:
    """The same gates with the angles themselves as parameters, in the order of `angles_of`."""
    if isinstance(program, ExcitationProgram):
        count = len(program.excitations)
        labels = tuple(e.label() for e in program.excitations)
        return replace(program, parameter=np.arange(count), factor=np.ones(count), n_parameters=count, parameter_labels=labels)
    live = _turned(program)
    parameter, factor = program.parameter.copy(), program.factor.copy()
    parameter[live], factor[live] = np.arange(np.count_nonzero(live)), 1.0
    return replace(program, parameter=parameter, factor=factor, n_parameters=int(np.count_nonzero(live)), parameter_labels=())


def _turned(program: GateProgram) -> np.ndarray:
    turned: np.ndarray = (program.kind == Gate.ROTATION) & (program.parameter >= 0)
    return turned
