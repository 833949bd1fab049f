"""Simultaneous perturbation stochastic approximation (Spall 1992, 1998)."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.structure import Structure
from thalweg.optimize.objective import Objective
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


class SPSA(OptimizerSettings):
    """Two energies a step, whatever the number of parameters: the slope along a random direction of +-1."""

    title: ClassVar[str] = "SPSA"
    about: ClassVar[str] = "Two energies a step for any number of parameters, and bears noise; needs many steps (Spall 1998)."

    key: Literal["spsa"] = "spsa"
    step: float = option(0.0, "Step a", "Numerator of the step gains a_k; 0 finds it by calibration.", ge=0)
    perturbation: float = option(0.1, "Perturbation c", "Numerator of the perturbations c_k.", unit="rad", gt=0)
    first_step: float = option(0.1, "First step", "Calibration gives the first step this size in every parameter, on average.", unit="rad", gt=0)
    calibration: int = option(25, "Calibration", "Pairs of energies that the calibration takes (Kandala et al. 2017).", ge=1, le=1000)
    stability: float = option(0.1, "Stability A", "Part of the iterations by which the gains are delayed.", ge=0, le=1, advanced=True)
    step_exponent: float = option(0.602, "Step exponent", "Decay of a_k.", gt=0, le=1, advanced=True)
    perturbation_exponent: float = option(0.101, "Perturbation exponent", "Decay of c_k.", ge=0, le=1, advanced=True)

    def energies_a_step(self, structure: Structure, gradient: int) -> int:
        return 2

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        x, step = start.copy(), self.step or self.calibrated(objective, start, rng)
        for k in range(self.max_iterations):
            gain, distance = self.gains(k, step)
            slope, direction = _slope(objective, x, distance, rng)
            x = x - gain * slope * direction
            objective.iterate(x)
        return "iterations"

    def gains(self, k: int, step: float) -> tuple[float, float]:
        """a_k = a / (A + k + 1)^0.602 and c_k = c / (k + 1)^0.101."""
        delay = self.stability * self.max_iterations
        return step / (delay + k + 1) ** self.step_exponent, self.perturbation / (k + 1) ** self.perturbation_exponent

    def calibrated(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> float:
        """The numerator a with which the first step is `first_step` for the mean slope over random directions at the start."""
        slopes = [abs(_slope(objective, start, self.perturbation, rng)[0]) for _ in range(self.calibration)]
        mean, unit = float(np.mean(slopes)), self.gains(0, 1.0)[0]
        return self.first_step / (unit * mean) if mean > 0 else self.first_step / unit


def _slope(objective: Objective, x: FloatArray, distance: float, rng: np.random.Generator) -> tuple[float, FloatArray]:
    """The slope along a random direction of +-1, which is its own inverse component by component."""
    direction = rng.choice([-1.0, 1.0], x.size)
    plus, minus = objective.value(x + distance * direction), objective.value(x - distance * direction)
    return (plus - minus) / (2 * distance), direction
