"""The base of every way to evaluate, and of what it makes."""

from __future__ import annotations

from collections.abc import Callable
from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.structure import Structure
from thalweg.estimate import AXES, HARMONICS, Cost, Estimate, Metric, MetricPart, Slopes
from thalweg.evaluate.metric import metric_circuits, part_of
from thalweg.evaluate.shift import SHIFT_RULES
from thalweg.evaluate.simulator import Simulator
from thalweg.options import Options

GradientSource = Literal["adjoint", "shift-rule"]
GRADIENT_HELP = "Adjoint: one backward sweep of the simulation, not counted. Shift rule: energies at shifted angles, counted as on a device."
Allocation = Literal["uniform", "by-weight", "by-variance"]
ALLOCATION_HELP = "How the sets share the shots: equally, by their sums of |c|, or by the spread of their outcomes, which a tenth of the shots find."


class EvaluationSettings(Options):
    """A way to evaluate is its settings plus `offers` and `source`; `is_sampled`: whether its energies carry statistical noise."""

    is_sampled: ClassVar[bool] = False

    @property
    def counts_gradients(self) -> bool:
        """Whether gradients are taken from energies, each counted as on a device, instead of one sweep of the simulation."""
        return True

    def offers(self, structure: Structure) -> frozenset[str]:
        """What an optimiser gets beside values, gradients and the metric, known before the run."""
        return frozenset([HARMONICS] * structure.has_harmonics + [AXES] * bool(structure.triples))

    def source(self, simulator: Simulator, rng: np.random.Generator) -> Source:
        """What a search draws its numbers from. `rng`: of the sampling alone. StudyError where the settings do not fit."""
        raise AssertionError(f"{type(self).__name__} defines no source")


class Source:
    """Numbers for one search; see `optimize.objective.EnergySource`.

    Attributes:
        n_parameters: K.
        is_sampled: whether energies carry statistical noise.
        begins_by_simulation: whether the start is judged by the simulation alone, as gradients cost shots or evaluations.
    """

    is_sampled = False
    begins_by_simulation = False
    _shots_a_circuit = 0  # of an overlap

    def __init__(self, simulator: Simulator) -> None:
        self.simulator = simulator
        self.n_parameters = simulator.n_parameters

    @property
    def structure(self) -> Structure:
        """What is known of the energy from the program alone."""
        return self.simulator.structure

    def energy(self, parameters: FloatArray) -> Estimate:
        raise AssertionError(f"{type(self).__name__} gives no energy")

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[Estimate, Slopes]:
        raise AssertionError(f"{type(self).__name__} gives no gradient")

    def exact_energy(self, parameters: FloatArray) -> float:
        """Without noise, and counted nowhere."""
        return self.simulator.energy(parameters)

    def exact_energy_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]:
        """Without noise, and counted nowhere."""
        return self.simulator.energy_and_gradient(parameters)

    def metric(self, parameters: FloatArray, part: MetricPart) -> Metric:
        """The part of the tensor, exact; circuits are counted where gradients go by shifts."""
        tensor = part_of(self.simulator.metric(parameters), part, self.structure.layer)
        circuits = metric_circuits(self.simulator.angles, part, self.structure.layer) if self.begins_by_simulation else 0
        return Metric(tensor, 0.0, Cost(0, circuits, circuits * self._shots_a_circuit))

    def sampled_gradient(self, parameters: FloatArray, shots: FloatArray, *, random_terms: bool) -> Slopes:
        raise AssertionError("this evaluation draws no shots")

    def shifted_slopes(self, parameters: FloatArray, first: int) -> Slopes:
        """The derivatives by the parameters from number `first` on, by shift rules, each energy counted; shape (K - first,)."""
        every = self._shifted(parameters, self._at, first)
        variance = None if every.variance is None else every.variance[first:]
        return Slopes(every.gradient[first:], variance, every.cost, None if every.shots is None else every.shots[first:])

    def _at(self, angles: FloatArray, parameter: int) -> Estimate:
        """One energy of a shift rule for the derivative by this parameter."""
        raise AssertionError(f"{type(self).__name__} shifts no angles")

    def _shifted(self, parameters: FloatArray, measure: Callable[[FloatArray, int], Estimate], first: int = 0) -> Slopes:
        """The gradient from energies at shifted angles; `measure` takes the angles and the parameter that they belong to.

        Parameters before number `first` are left out: theirs stays 0.
        """
        map_, angles = self.simulator.angles, self.simulator.angles.of(parameters)
        by_parameter, variance = np.zeros(self.n_parameters), np.zeros(self.n_parameters)
        shots, count, cost, is_exact = np.zeros(self.n_parameters), np.zeros(self.n_parameters), Cost(0), True
        for a, (k, factor, highest) in enumerate(zip(map_.parameter.tolist(), map_.factor.tolist(), map_.highest.tolist(), strict=True)):
            if k < first:
                continue
            rule = SHIFT_RULES[highest]
            for shift, weight in zip(rule.shifts, rule.weights, strict=True):
                for sign in (1.0, -1.0):
                    shifted = angles.copy()
                    shifted[a] += sign * shift
                    estimate = measure(shifted, k)
                    by_parameter[k] += sign * weight * factor * estimate.energy
                    if estimate.standard_error is not None:
                        variance[k] += (weight * factor * estimate.standard_error) ** 2
                        is_exact = False
                    cost += estimate.cost
                    shots[k] += estimate.cost.shots
                    count[k] += 1
        return Slopes(by_parameter, None if is_exact else variance, cost, shots / np.maximum(count, 1))
