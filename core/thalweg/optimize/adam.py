"""Adaptive moment estimation (Kingma and Ba 2015)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


class Adam(OptimizerSettings):
    title: ClassVar[str] = "Adam"
    about: ClassVar[str] = "Steps scaled by running moments of the gradient; bears noise, ends slowly (Kingma and Ba 2015)."

    key: Literal["adam"] = "adam"
    step: float = option(0.02, "Step", "Size of a step in each parameter.", gt=0)
    first_decay: float = option(0.9, "First decay", "Decay of the mean of the gradient.", ge=0, lt=1, advanced=True)
    second_decay: float = option(0.999, "Second decay", "Decay of the mean of the squared gradient.", ge=0, lt=1, advanced=True)

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        x, mean, square = start.copy(), np.zeros_like(start), np.zeros_like(start)
        for t in range(1, self.max_iterations + 1):
            _, gradient = objective.value_and_gradient(x)
            objective.iterate(x)
            mean = self.first_decay * mean + (1 - self.first_decay) * gradient
            square = self.second_decay * square + (1 - self.second_decay) * gradient**2
            unbiased = mean / (1 - self.first_decay**t)
            scale = np.sqrt(square / (1 - self.second_decay**t)) + 1e-8
            x = x - self.step * unbiased / scale
        return "iterations"
