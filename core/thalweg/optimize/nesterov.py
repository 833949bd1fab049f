"""Accelerated gradient descent (Nesterov 1983)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


class Nesterov(OptimizerSettings):
    title: ClassVar[str] = "Nesterov"
    about: ClassVar[str] = "Momentum with the gradient taken where the momentum leads; overshoots less than plain momentum (Nesterov 1983)."

    key: Literal["nesterov"] = "nesterov"
    step: float = option(0.05, "Step", "Scale of the gradient in each step.", gt=0)
    memory: float = option(0.9, "Memory", "Part of the last step that is kept.", ge=0, lt=1)

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        x, velocity = start.copy(), np.zeros_like(start)
        for _ in range(self.max_iterations):
            ahead = x + self.memory * velocity
            _, gradient = objective.value_and_gradient(ahead)
            objective.iterate(ahead)  # the points ahead converge with the others, and need no evaluation of their own
            velocity = self.memory * velocity - self.step * gradient
            x = x + velocity
        return "iterations"
