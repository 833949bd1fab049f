"""Imaginary-time evolution by McLachlan's variational principle (McLachlan 1964; McArdle et al. 2019)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.estimate import MetricPart
from thalweg.optimize.natural_gradient import regularised_solution
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option

#: Part of the fall foretold by the slope that an accepted step must bring; factors by which the step grows and shrinks; its least size.
LEAST_FALL, GROWTH, SHRINKING, LEAST_STEP = 0.1, 1.3, 0.5, 1e-8
#: Standard errors of an energy by which a step may seem to climb: the difference of two has sqrt(2), and two of these are kept.
NOISE_MARGIN = 3.0


class ImaginaryTime(OptimizerSettings):
    """g dtheta/dtau = -gradient / 2: a natural-gradient step with half the time step, whose length follows the fall of the energy."""

    title: ClassVar[str] = "Imaginary-time evolution"
    about: ClassVar[str] = "Follows exp(-H tau) within the trial states; needs no step size, but many circuits for the metric (McArdle et al. 2019)."

    key: Literal["imaginary-time"] = "imaginary-time"
    time_step: float = option(0.1, "First time step", "Imaginary time of the first step; later ones adapt.", unit="1/Eh", gt=0)
    largest_step: float = option(10.0, "Largest time step", "No step is longer.", unit="1/Eh", gt=0, advanced=True)
    regularisation: float = option(1e-6, "Regularisation", "Added to the diagonal of the metric.", ge=0)

    def metric_a_step(self) -> MetricPart | None:
        return "full"

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        x, time_step = start.copy(), min(self.time_step, self.largest_step)
        value, gradient = objective.value_and_gradient(x)
        for _ in range(self.max_iterations):
            rate = self.rate(objective, x, gradient)
            foretold = -float(gradient @ rate)
            while True:
                there = x + time_step * rate
                new_value, new_gradient = objective.value_and_gradient(there)
                if new_value <= value - LEAST_FALL * time_step * foretold + NOISE_MARGIN * objective.noise:
                    break
                time_step *= SHRINKING
                if time_step < LEAST_STEP:
                    return "line-search"
            x, value, gradient = there, new_value, new_gradient
            objective.iterate(x)
            time_step = min(GROWTH * time_step, self.largest_step)
        return "iterations"

    def rate(self, objective: Objective, x: FloatArray, gradient: FloatArray) -> FloatArray:
        """dtheta/dtau, shape (K,)."""
        return -0.5 * regularised_solution(objective.metric(x), gradient, self.regularisation)
