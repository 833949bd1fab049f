"""The base of every optimiser."""

from __future__ import annotations

from typing import ClassVar

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.structure import Structure
from thalweg.errors import StudyError
from thalweg.estimate import AXES, HARMONICS, SHOTS, MetricPart
from thalweg.optimize.objective import Objective
from thalweg.options import Options, option

#: What an optimiser may need -> why it may be missing, and what to do then.
MISSING = {
    SHOTS: ("it chooses the number of shots itself, and {evaluation} draws none", "Choose the evaluation by shots, or another optimiser"),
    HARMONICS: (
        "the angles of a parameter are not multiples of a common one, so that the energy along it is no short sum of sines",
        "Choose another optimiser or trial state",
    ),
    AXES: (
        "the trial state has no single-qubit rotations with parameters of their own",
        "Choose hardware-efficient layers, or another optimiser",
    ),
}


class OptimizerSettings(Options):
    """An optimiser is its settings plus `minimise`; it sees only the objective.

    `needs`: what the objective must offer beside values, gradients and the metric, words of `thalweg.estimate`.
    """

    needs: ClassVar[frozenset[str]] = frozenset()

    max_iterations: int = option(2000, "Iterations", "Stop after this many iterations.", ge=1)

    def energies_a_step(self, structure: Structure, gradient: int) -> int:
        """Energies that a device would measure for one iteration; `gradient`: those of a gradient by shift rules."""
        return 1 + gradient

    def metric_a_step(self) -> MetricPart | None:
        """What of the metric one iteration takes; None for nothing."""
        return None

    def minimise(self, objective: Objective, start: FloatArray, rng: np.random.Generator) -> str:
        """Runs until its own rule or `Stopped`; returns the reason, a key of STOP_REASONS.

        It calls `objective.iterate(x)` once an iteration and never catches `Stopped`.
        """
        raise AssertionError(f"{type(self).__name__} defines no minimise")


def refuse_unless_offered(optimizer: OptimizerSettings, offers: frozenset[str], evaluation: str) -> None:
    """StudyError where the optimiser needs what is not offered. `evaluation`: title of the way to evaluate."""
    for need in (AXES, HARMONICS, SHOTS):
        if need in optimizer.needs - offers:
            why, fix = MISSING[need]
            raise StudyError(f"{optimizer.title} cannot search here", why.format(evaluation=f"'{evaluation}'"), fix, "optimizer")
