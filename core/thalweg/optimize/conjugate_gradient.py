"""Nonlinear conjugate gradients (Polak and Ribiere 1969), by scipy."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.objective import Objective
from thalweg.optimize.scipy_bridge import minimise_with_scipy, reason_from_scipy
from thalweg.optimize.settings import OptimizerSettings


class ConjugateGradient(OptimizerSettings):
    title: ClassVar[str] = "Conjugate gradient"
    about: ClassVar[str] = "Little memory and good steps for many parameters; needs exact gradients for its line searches (Polak and Ribiere 1969)."

    key: Literal["conjugate-gradient"] = "conjugate-gradient"

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        # The stop rules decide, so scipy's own tolerance is switched off.
        result = minimise_with_scipy("CG", objective, start, {"maxiter": self.max_iterations, "gtol": 0.0}, gradient=True)
        return reason_from_scipy(result, self.max_iterations)
