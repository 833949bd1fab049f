"""Downhill simplex (Nelder and Mead 1965; adaptive form of Gao and Han 2012), by scipy."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.structure import Structure
from thalweg.optimize.objective import Objective
from thalweg.optimize.scipy_bridge import minimise_with_scipy, reason_from_scipy
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


class NelderMead(OptimizerSettings):
    title: ClassVar[str] = "Nelder-Mead"
    about: ClassVar[str] = "Needs no gradient; may stall, and is slow above some tens of parameters (Nelder and Mead 1965)."

    key: Literal["nelder-mead"] = "nelder-mead"
    first_step: float = option(0.1, "First step", "Edge of the first simplex.", unit="rad", gt=0)
    tolerance: float = option(1e-9, "Tolerance", "Spread of energies over the simplex at which the search ends.", unit="Eh", gt=0)

    def energies_a_step(self, structure: Structure, gradient: int) -> int:
        return 2  # a reflection, and mostly one point more

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        simplex = np.vstack([start, start + self.first_step * np.eye(start.size)])
        limits = {
            "maxiter": self.max_iterations,
            "maxfev": 10**9,
            "fatol": self.tolerance,
            "xatol": 1e-4,
            "adaptive": start.size > 2,
            "initial_simplex": simplex,
        }
        result = minimise_with_scipy("Nelder-Mead", objective, start, limits, gradient=False)
        return reason_from_scipy(result, self.max_iterations)
