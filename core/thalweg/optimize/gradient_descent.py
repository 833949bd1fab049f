"""Plain gradient descent with a fixed step."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


class GradientDescent(OptimizerSettings):
    title: ClassVar[str] = "Gradient descent"
    about: ClassVar[str] = "The simplest baseline; a step too large diverges, too small crawls (Cauchy 1847)."

    key: Literal["gradient-descent"] = "gradient-descent"
    step: float = option(0.1, "Step", "theta <- theta - step * gradient.", gt=0)

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        x = start.copy()
        for _ in range(self.max_iterations):
            _, gradient = objective.value_and_gradient(x)
            objective.iterate(x)
            x = x - self.step * gradient
        return "iterations"
