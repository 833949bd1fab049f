"""What a minimisation leaves behind for the result."""

from __future__ import annotations

from dataclasses import dataclass, field, fields, replace
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.program import Program
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


@dataclass(frozen=True)
class PlainEnd:
    """Record and end of a start on the way between processes: the study itself, which both sides have, stays behind.

    Attributes:
        program: what the trial state grew to; None where it is that of the settings.
        rest: the other fields of the end.
    """

    record: StartRecord
    program: Program | None
    rest: dict[str, Any]


def without_study(record: StartRecord, end: SearchEnd, study: Problem) -> PlainEnd:
    """What is to be told of a start of this study."""
    program = None if end.problem.program is study.program else end.problem.program
    return PlainEnd(record, program, {f.name: getattr(end, f.name) for f in fields(end) if f.name != "problem"})


def with_study(told: PlainEnd, study: Problem) -> tuple[StartRecord, SearchEnd]:
    """The record and the end that were told."""
    problem = study if told.program is None else replace(study, program=told.program)
    return told.record, SearchEnd(problem=problem, **told.rest)


@dataclass
class Outcome:
    """The record and the end of each start that came to one, in the order of the starts.

    Attributes:
        lost: starts, counted from 0, whose process ended.
        elapsed: seconds by the clock where starts ran side by side; None where they ran one after another.
    """

    starts: list[StartRecord] = field(default_factory=list)
    ends: list[SearchEnd] = field(default_factory=list)
    lost: tuple[int, ...] = ()
    elapsed: float | None = None

    @property
    def best(self) -> int:
        return int(np.argmin([record.energy for record in self.starts]))
