"""Estimates of an energy and of its slopes: the numbers, their statistical errors, and what they would have cost on a device."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from thalweg.arrays import FloatArray


@dataclass(frozen=True)
class Cost:
    """What a device would have done.

    Attributes:
        evaluations: energies at one setting of the parameters.
        circuits: different circuits run: one a setting of the parameters and a measurement set; 0 where nothing is counted so.
        shots: repetitions of circuits, all together.
    """

    evaluations: int = 1
    circuits: int = 0
    shots: int = 0

    def __add__(self, other: Cost) -> Cost:
        return Cost(self.evaluations + other.evaluations, self.circuits + other.circuits, self.shots + other.shots)


FREE = Cost(0)


@dataclass(frozen=True)
class Estimate:
    """An energy with its standard error; the error is None where the number is exact."""

    energy: float
    standard_error: float | None = None
    cost: Cost = Cost()


@dataclass(frozen=True)
class Slopes:
    """The gradient, shape (K,), with the variance of each component; the variance is None where the gradient is exact.

    Attributes:
        shots: taken for each of the energies that a component needs, on average, shape (K,); None where none were taken.
    """

    gradient: FloatArray
    variance: FloatArray | None = None
    cost: Cost = FREE
    shots: FloatArray | None = None


#: All of the tensor, its blocks of parameters that commute and follow each other, or its diagonal.
MetricPart = Literal["full", "block-diagonal", "diagonal"]


@dataclass(frozen=True)
class Metric:
    """The quantum metric tensor, shape (K, K), with the standard error of its least certain element; 0 where it is exact."""

    tensor: FloatArray
    standard_error: float = 0.0
    cost: Cost = FREE


#: What an optimiser may need and an evaluation may offer beside values, gradients and the metric: gradients from a given number of
#: shots; the frequencies of the energy in every parameter; gates with free axes.
SHOTS, HARMONICS, AXES = "shots", "harmonics", "axes"
