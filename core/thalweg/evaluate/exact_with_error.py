"""Exact energies with the standard error that shots would have."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.estimate import FREE, Cost, Estimate, Slopes
from thalweg.evaluate.allocation import spread
from thalweg.evaluate.settings import ALLOCATION_HELP, GRADIENT_HELP, Allocation, EvaluationSettings, GradientSource, Source
from thalweg.evaluate.shots import SETS_HELP, MeasurementSets, refuse_too_few
from thalweg.evaluate.simulator import Simulator
from thalweg.options import option


class ExactWithError(EvaluationSettings):
    title: ClassVar[str] = "Exact, with the error of shots"
    about: ClassVar[str] = "Energies without noise, each with the standard error that the shots would have: how many shots a claim needs."

    key: Literal["exact-with-error"] = "exact-with-error"
    shots: int = option(10_000, "Shots", "Shots of one energy, over all measurement sets together.", ge=1, le=10**12)
    allocation: Allocation = option("by-weight", "Allocation", ALLOCATION_HELP)
    sets: MeasurementSets = option("qubit-wise", "Measurement sets", SETS_HELP)
    gradient: GradientSource = option("adjoint", "Gradient", GRADIENT_HELP)

    @property
    def counts_gradients(self) -> bool:
        return self.gradient == "shift-rule"

    def source(self, simulator: Simulator, rng: np.random.Generator) -> Source:
        """StudyError where the shots do not go round."""
        refuse_too_few(self.shots, simulator, "uniform")
        return ExpectedSource(simulator, self)


class ExpectedSource(Source):
    """Energies of the simulation, errors from the exact variance of every set; with `by-variance` the allocation is the best one."""

    def __init__(self, simulator: Simulator, settings: ExactWithError) -> None:
        super().__init__(simulator)
        self.begins_by_simulation = settings.counts_gradients
        self._settings, self._shots_a_circuit = settings, settings.shots
        self._cost = Cost(1, simulator.set_weights.size, settings.shots)

    def energy(self, parameters: FloatArray) -> Estimate:
        return Estimate(self.simulator.energy(parameters), self._error(self.simulator.angles.of(parameters)), self._cost)

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[Estimate, Slopes]:
        if self.begins_by_simulation:
            return self.energy(parameters), self._shifted(parameters, self._at)
        energy, gradient = self.simulator.energy_and_gradient(parameters)
        return Estimate(energy, self._error(self.simulator.angles.of(parameters)), self._cost), Slopes(gradient, None, FREE)

    def _at(self, angles: FloatArray, parameter: int) -> Estimate:
        return Estimate(self.simulator.energy_at(angles), None, self._cost)

    def _error(self, angles: FloatArray) -> float:
        variances = self.simulator.set_variances(angles)
        weights = self.simulator.set_weights
        shares = {"uniform": np.ones_like(weights), "by-weight": weights, "by-variance": np.sqrt(variances)}[self._settings.allocation]
        return float(np.sqrt((variances / spread(self._settings.shots, shares)).sum()))
