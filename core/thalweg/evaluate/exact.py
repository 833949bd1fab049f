"""Exact energies."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.estimate import FREE, Cost, Estimate, Slopes
from thalweg.evaluate.settings import GRADIENT_HELP, EvaluationSettings, GradientSource, Source
from thalweg.evaluate.simulator import Simulator
from thalweg.options import option


class Exact(EvaluationSettings):
    title: ClassVar[str] = "Exact"
    about: ClassVar[str] = "Expectation values of the simulated state: what infinitely many shots would give."

    key: Literal["exact"] = "exact"
    gradient: GradientSource = option("adjoint", "Gradient", GRADIENT_HELP)

    @property
    def counts_gradients(self) -> bool:
        return self.gradient == "shift-rule"

    def source(self, simulator: Simulator, rng: np.random.Generator) -> Source:
        return ExactSource(simulator, by_shifts=self.counts_gradients)


class ExactSource(Source):
    """Energies of the simulation. With shift rules, circuits are counted as a device would run them."""

    def __init__(self, simulator: Simulator, *, by_shifts: bool) -> None:
        super().__init__(simulator)
        self.begins_by_simulation = by_shifts
        self._cost = Cost(1, simulator.set_weights.size) if by_shifts else Cost()

    def energy(self, parameters: FloatArray) -> Estimate:
        return Estimate(self.simulator.energy(parameters), None, self._cost)

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[Estimate, Slopes]:
        if self.begins_by_simulation:
            return self.energy(parameters), self._shifted(parameters, self._at)
        energy, gradient = self.simulator.energy_and_gradient(parameters)
        return Estimate(energy, None, self._cost), Slopes(gradient, None, FREE)

    def _at(self, angles: FloatArray, parameter: int) -> Estimate:
        return Estimate(self.simulator.energy_at(angles), None, self._cost)
