"""Depth ladder: a layered trial state with 1, 2, 3 ... layers, each searched from the best of the last.

Where the study starts from another run of the same circuit, the first rung is that run's depth.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import Stopped
from thalweg.study.course import Course, Descent
from thalweg.study.neighbour import first_depth
from thalweg.study.outcome import SearchEnd
from thalweg.study.problem import trial_state
from thalweg.study.simulator import depth_field


def climb(course: Course) -> SearchEnd:
    """Climbs to the depth of the settings, until the target is reached or one layer more gains less than `ladder.least_gain`.

    Before a step is given up, it is tried once more from a small random displacement, since the shallower state may be a
    stationary point of the deeper circuit. StudyError where the trial state has no depth.
    """
    ansatz: Any = course.problem.spec.ansatz
    name = depth_field(ansatz)
    kept: list[Descent] = []
    reason = ""
    try:
        for depth in range(first_depth(course.problem), getattr(ansatz, name) + 1):
            course.watch.stage(f"Depth {depth}")
            descent = _rung(course, ansatz.model_copy(update={name: depth}), kept[-1] if kept else None)
            if kept and not _falls(course, kept[-1], descent):
                reason = descent.reason if descent.is_final else "no-gain"
                break
            kept.append(descent)
            course.take_step(descent, (f"depth {depth}",), None)
            reason = descent.reason
            if descent.is_final or course.reaches_target(descent):
                reason = reason if descent.is_final else "target"
                break
    except Stopped as stop:
        if not kept:
            raise
        reason = stop.reason
    return _end(course, kept, reason)


def _rung(course: Course, ansatz: Any, below: Descent | None) -> Descent:
    program = trial_state(course.problem.spec, ansatz, course.problem.ground)
    if below is None:
        return course.minimise(program, course.parameters_of(ansatz, program))
    start: FloatArray = ansatz.from_shallower(below.parameters, program.n_parameters)
    descent = course.minimise(program, start)
    if descent.is_final or _falls(course, below, descent):
        return descent
    again = course.minimise(program, course.displaced(start), descent.engine)
    return min(again, descent, key=lambda d: d.energy)


def _falls(course: Course, below: Descent, descent: Descent) -> bool:
    """Whether one layer more gained enough; measured energies must show it by two standard errors of their difference."""
    least = course.problem.spec.ladder.least_gain
    if course.is_sampled:
        least = max(least, 2.0 * float(np.hypot(below.standard_error or 0.0, descent.standard_error or 0.0)))
    return descent.energy <= below.energy - least


def _end(course: Course, kept: list[Descent], reason: str) -> SearchEnd:
    first, best = kept[0], kept[-1]
    end = best.end(reason, tuple(course.steps))
    start = np.array(first.start)
    return replace(end, start_parameters=start, start_energy=first.start_energy, start_gradient_norm=first.start_gradient_norm)
