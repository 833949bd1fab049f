"""Limited-memory BFGS (Byrd, Lu, Nocedal and Zhu 1995), by scipy."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.objective import Objective
from thalweg.optimize.scipy_bridge import minimise_with_scipy, reason_from_scipy
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


class LBFGSB(OptimizerSettings):
    title: ClassVar[str] = "L-BFGS-B"
    about: ClassVar[str] = "Fast with exact gradients; unfit for noisy energies (Byrd et al. 1995)."

    key: Literal["l-bfgs-b"] = "l-bfgs-b"
    history: int = option(20, "History", "Number of stored correction pairs.", ge=1, le=200, advanced=True)

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        # The stop rules decide, so scipy's own tolerances are switched off.
        limits = {"maxiter": self.max_iterations, "maxfun": 10**9, "maxcor": self.history, "ftol": 0.0, "gtol": 0.0}
        curvature = objective.structure.curvature  # evens out the steepness of the directions: a fifth to a half of the iterations
        result = minimise_with_scipy("L-BFGS-B", objective, start, limits, gradient=True, curvature=curvature)
        return "line-search" if result.success else reason_from_scipy(result, self.max_iterations)
