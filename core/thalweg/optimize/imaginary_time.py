"""Imaginary-time evolution by McLachlan's variational principle (McLachlan 1964; McArdle et al. 2019)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.estimate import METRIC
from thalweg.optimize.natural_gradient import regularised_solution
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option

#: Part of the fall foretold by the slope that an accepted step must bring; factors by which the step grows and shrinks; its least size.
LEAST_FALL, GROWTH, SHRINKING, LEAST_STEP = 0.1, 1.3, 0.5, 1e-8


class ImaginaryTime(OptimizerSettings):
    """g dtheta/dtau = -gradient / 2: a natural-gradient step with half the time step, whose length follows the fall of the energy."""

    title: ClassVar[str] = "Imaginary-time evolution"
    about: ClassVar[str] = (
        "Follows exp(-H tau) within the trial states; robust without a step size, the metric costs many circuits (McArdle et al. 2019)."
    )
    needs: ClassVar[frozenset[str]] = frozenset({METRIC})

    key: Literal["imaginary-time"] = "imaginary-time"
    time_step: float = option(0.1, "First time step", "Imaginary time of the first step; later ones adapt.", unit="1/Eh", gt=0)
    largest_step: float = option(10.0, "Largest time step", "No step is longer.", unit="1/Eh", gt=0, advanced=True)
    regularisation: float = option(1e-6, "Regularisation", "Added to the diagonal of the metric.", ge=0)

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        x, time_step = start.copy(), min(self.time_step, self.largest_step)
        value, gradient = objective.value_and_gradient(x)
        for _ in range(self.max_iterations):
            rate = self.rate(objective, x, gradient)
            foretold = -float(gradient @ rate)
            while True:
                there = x + time_step * rate
                new_value, new_gradient = objective.value_and_gradient(there)
                if new_value <= value - LEAST_FALL * time_step * foretold:
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
