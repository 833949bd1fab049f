"""Gradient descent with momentum (Polyak 1964)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


class Momentum(OptimizerSettings):
    title: ClassVar[str] = "Momentum"
    about: ClassVar[str] = "Gradient descent that keeps part of its last step; overshoots when the memory is long (Polyak 1964)."

    key: Literal["momentum"] = "momentum"
    step: float = option(0.05, "Step", "Scale of the gradient in each step.", gt=0)
    memory: float = option(0.9, "Memory", "Part of the last step that is kept.", ge=0, lt=1)

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        x, velocity = start.copy(), np.zeros_like(start)
        for _ in range(self.max_iterations):
            _, gradient = objective.value_and_gradient(x)
            objective.iterate(x)
            velocity = self.memory * velocity - self.step * gradient
            x = x + velocity
        return "iterations"
