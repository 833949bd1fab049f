"""Constrained optimisation by linear approximation (Powell 1994), by scipy."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.structure import Structure
from thalweg.optimize.objective import Objective
from thalweg.optimize.scipy_bridge import minimise_with_scipy
from thalweg.optimize.settings import OptimizerSettings
from thalweg.options import option


class COBYLA(OptimizerSettings):
    title: ClassVar[str] = "COBYLA"
    about: ClassVar[str] = "Needs no gradient and bears some noise; slow above some tens of parameters (Powell 1994)."

    key: Literal["cobyla"] = "cobyla"
    first_step: float = option(0.3, "First step", "Radius of the first simplex.", unit="rad", gt=0)
    tolerance: float = option(1e-6, "Tolerance", "Radius at which the search ends.", unit="rad", gt=0)

    def energies_a_step(self, structure: Structure, gradient: int) -> int:
        return 1

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        least = start.size + 2  # the first simplex and one step: the method makes no sense with less
        limits = {"maxiter": max(self.max_iterations, least), "rhobeg": self.first_step, "tol": self.tolerance}
        result = minimise_with_scipy("COBYLA", objective, start, limits, gradient=False, iterate_on_call=True)
        return "converged" if result.success else "iterations"
