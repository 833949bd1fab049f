"""Sequential least squares programming (Kraft 1988), by scipy."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.objective import Objective
from thalweg.optimize.scipy_bridge import minimise_with_scipy, reason_from_scipy
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


class SLSQP(OptimizerSettings):
    title: ClassVar[str] = "SLSQP"
    about: ClassVar[str] = "Few iterations with exact gradients; dense algebra makes it slow above some hundred parameters (Kraft 1988)."

    key: Literal["slsqp"] = "slsqp"
    tolerance: float = option(1e-12, "Tolerance", "Stop when the energy changes by less than this.", unit="Eh", gt=0, advanced=True)

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        limits = {"maxiter": self.max_iterations, "ftol": self.tolerance}
        result = minimise_with_scipy("SLSQP", objective, start, limits, gradient=True)
        return reason_from_scipy(result, self.max_iterations)
