"""What a minimisation leaves behind for the result."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.study.problem import Problem
from thalweg.study.result import GrowthStep, StartRecord


@dataclass(frozen=True)
class SearchEnd:
    """Where one start came to.

    Attributes:
        problem: the study with the trial state that the search ended with.
        parameters: the best of that trial state, shape (K,).
        energy, gradient_norm: there; the norm is None where no gradient was worked out.
        reason: a key of STOP_REASONS.
        standard_error: of a sampled energy, or the one that shots would have; None where there is none.
        start_parameters, start_energy, start_gradient_norm: where it began; the largest slope of the pool counts as a gradient.
        growth: the steps of a trial state that grew.
    """

    problem: Problem
    parameters: FloatArray
    energy: float
    gradient_norm: float | None
    reason: str
    start_parameters: FloatArray
    start_energy: float
    start_gradient_norm: float
    growth: tuple[GrowthStep, ...] = ()
    standard_error: float | None = None


@dataclass
class Outcome:
    """The record and the end of each start."""

    starts: list[StartRecord] = field(default_factory=list)
    ends: list[SearchEnd] = field(default_factory=list)

    @property
    def best(self) -> int:
        return int(np.argmin([record.energy for record in self.starts]))
