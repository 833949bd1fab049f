"""What an evaluation asks of whatever simulates the circuit."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.angles import Angles
from thalweg.circuit.structure import Structure


@dataclass(frozen=True)
class SetSums:
    """Outcomes of each measurement set, summed: value of a shot and its square; shots taken, all of shape (G,).

    The value of a shot of set g is sum over its terms of c_l times the +-1 read off the bit string.
    """

    shots: IntArray
    first: FloatArray
    second: FloatArray

    def means(self) -> FloatArray:
        return self.first / np.maximum(self.shots, 1)

    def variances(self) -> FloatArray:
        """Sample variances of one shot, unbiased; 0 where fewer than two shots were taken."""
        spread = self.second - self.first * self.means()
        return np.maximum(spread, 0.0) / np.maximum(self.shots - 1, 1)


class Simulator(Protocol):
    """One program on one Hamiltonian. Parameters have shape (K,), angles (A,); energies in the Hamiltonian's unit."""

    @property
    def n_parameters(self) -> int: ...

    @property
    def angles(self) -> Angles: ...

    @property
    def structure(self) -> Structure: ...

    @property
    def set_weights(self) -> FloatArray:
        """sum |c_l| of each measurement set, shape (G,)."""
        ...

    @property
    def constant(self) -> float:
        """The part of the energy that is not measured: the identity's coefficient."""
        ...

    def energy(self, parameters: FloatArray) -> float: ...

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]: ...

    def energy_at(self, angles: FloatArray) -> float: ...

    def sample(self, angles: FloatArray, shots: IntArray, rng: np.random.Generator) -> SetSums:
        """Draws bit strings of every set, shots of shape (G,)."""
        ...

    def set_variances(self, angles: FloatArray) -> FloatArray:
        """Exact variance of one shot of each set, shape (G,)."""
        ...

    def state(self, angles: FloatArray) -> Any:
        """Amplitudes in some fixed order, any shape."""
        ...

    def metric(self, parameters: FloatArray) -> FloatArray:
        """Quantum metric tensor (Fubini-Study), shape (K, K)."""
        ...
