"""What the shot-frugal descents share: a fixed step, running means of gradient and variance, and shots that follow from them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.structure import Structure
from thalweg.errors import StudyError
from thalweg.estimate import SHOTS
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


@dataclass(frozen=True)
class Knowledge:
    """What the last steps have taught.

    Attributes:
        gradient, variance: running means of the components and of the variance of one shot of each, shape (K,).
        rate: L times the step, below 2.
        step: the step.
        bias: what is added to squared gradients, so that none vanishes; it fades with the iterations.
    """

    gradient: FloatArray
    variance: FloatArray
    rate: float
    step: float
    bias: float


class ShotFrugal(OptimizerSettings):
    """Descent with the shots that promise the largest fall of the energy for each of them."""

    needs: ClassVar[frozenset[str]] = frozenset({SHOTS})
    random_terms: ClassVar[bool] = False

    step: float = option(0.0, "Step", "theta <- theta - step * gradient; 0 takes 1/L. It must stay below 2/L.", ge=0)
    steepness: float = option(
        0.0, "Steepness L", "Lipschitz constant of the gradient; 0 takes the bound (largest frequency)^2 sum |c|.", unit="Eh", ge=0, advanced=True
    )
    least_shots: int = option(2, "Least shots", "Shots of one energy at the least.", ge=2, le=10**6)
    most_shots: int = option(1_000_000, "Most shots", "Shots of one energy at the most.", ge=2, le=10**8, advanced=True)
    memory: float = option(0.99, "Memory", "Decay of the running means.", ge=0, lt=1, advanced=True)
    bias: float = option(1e-6, "Bias", "Keeps the shots finite where the mean gradient vanishes; it fades.", gt=0, advanced=True)

    def next_shots(self, known: Knowledge) -> FloatArray:
        """Shots of each energy of every component, shape (K,), before rounding up and before the limits of the settings."""
        raise AssertionError(f"{type(self).__name__} gives no shots")

    def energies_a_step(self, structure: Structure, gradient: int) -> int:
        return gradient

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        steepness = self.steepness or objective.structure.steepness
        step = self._checked_step(steepness)
        x, shots = start.copy(), np.full(start.size, float(self.least_shots))
        gradient, variance = np.zeros(start.size), np.zeros(start.size)
        for k in range(self.max_iterations):
            slopes = objective.sampled_gradient(x, shots, random_terms=self.random_terms)
            assert slopes.variance is not None
            assert slopes.shots is not None
            objective.iterate(x)
            gradient = self.memory * gradient + (1 - self.memory) * slopes.gradient
            variance = self.memory * variance + (1 - self.memory) * slopes.variance * slopes.shots
            x = x - step * slopes.gradient
            whole = 1 - self.memory ** (k + 1)
            known = Knowledge(gradient / whole, variance / whole, steepness * step, step, self.bias * self.memory**k)
            shots = np.clip(np.ceil(self.next_shots(known)), self.least_shots, self.most_shots)
        return "iterations"

    def _checked_step(self, steepness: float) -> float:
        step = self.step or 1.0 / steepness
        if step * steepness >= 2.0:
            raise StudyError(
                f"A step of {step:g} is too long",
                f"the gradient changes by up to {steepness:.4g} Eh a radian, and a step of {2.0 / steepness:.4g} or more may climb",
                "Give a shorter step, or 0",
                "optimizer.step",
            )
        return step
