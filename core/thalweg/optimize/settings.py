"""The base of every optimiser."""

from __future__ import annotations

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.optimize.objective import Objective
from thalweg.options import Options, option


class OptimizerSettings(Options):
    """An optimiser is its settings plus `minimise`; it sees only the objective."""

    max_iterations: int = option(2000, "Iterations", "Stop after this many iterations.", ge=1)

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        """Runs until its own rule or `Stopped`; returns the reason, a key of STOP_REASONS.

        It calls `objective.iterate(x)` once an iteration and never catches `Stopped`.
        """
        raise AssertionError(f"{type(self).__name__} defines no minimise")
