"""Adaptive growth: append the operators with the largest slopes, search all parameters again, and so on (Grimsley et al. 2019).

It begins with the reference, or with what another run had grown where the study starts from one.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np

from thalweg.ansatz.adaptive import Adaptive
from thalweg.ansatz.pools import ExcitationPool
from thalweg.arrays import FloatArray
from thalweg.errors import Stopped
from thalweg.study.course import Course, Descent
from thalweg.study.outcome import SearchEnd
from thalweg.study.problem import Problem, register_product, sector_product
from thalweg.watch import Watch

#: A slope below this, Eh, is rounding.
SMALLEST_SLOPE = 1e-9


def grow(course: Course, ansatz: Adaptive) -> SearchEnd:
    """Grows until the slopes vanish, the target or the limit is reached, or a rule of the study ends everything.

    Every step begins at the parameters of the last, with the new ones at the start that the settings name.
    """
    growing = _Growing(course, ansatz)
    try:
        reason = growing.run()
    except Stopped as stop:
        if not growing.descents:
            raise
        reason = stop.reason
    first = growing.descents[0]
    best = min(growing.descents, key=lambda descent: descent.energy)  # a measured one is low by luck: `afresh` measures it once more
    end = best.end(reason, tuple(course.steps))
    return replace(end, start_parameters=first.start, start_energy=first.start_energy, start_gradient_norm=growing.first_slope)


class _Growing:
    def __init__(self, course: Course, ansatz: Adaptive) -> None:
        self._course, self._ansatz = course, ansatz
        self.descents: list[Descent] = []
        self.first_slope = 0.0

    def run(self) -> str:
        course, ansatz = self._course, self._ansatz
        course.watch.stage("Making the pool of operators")
        pool = ansatz.operators(course.problem.ground)
        slopes_at = pool_slopes(course.problem, pool, course.watch)
        begun = course.problem.program
        descent = course.minimise(begun, course.parameters_of(ansatz, begun))
        self.descents.append(descent)
        added = begun.labels()
        barred = tuple(pool.labels.index(label) for label in added[-ansatz.at_once :])
        while True:
            slopes = slopes_at(descent.engine.state(descent.parameters))
            if not course.steps:
                self.first_slope = float(np.abs(slopes).max(initial=0.0))
            reason, smallest = self._reason_to_end(descent), np.full(slopes.size, SMALLEST_SLOPE)
            if not reason and course.problem.spec.evaluation.counts_gradients:
                slopes, smallest = self._as_measured(pool, descent, smallest)
            course.take_step(descent, added, float(np.abs(slopes).max(initial=0.0)))
            chosen = ansatz.choose(slopes, barred, smallest)
            reason = reason or self._reason_of_slopes(slopes, chosen, smallest)
            if reason:
                return reason
            count = descent.problem.program.n_parameters
            chosen = chosen[: ansatz.max_operators - count]
            added, barred = tuple(pool.labels[i] for i in chosen), tuple(chosen)
            course.watch.stage(f"Operator {count + len(chosen)}: {added[-1]}")
            program: Any = pool.grown(descent.problem.program, chosen)  # type: ignore[arg-type]  # the pool fits the program that the ansatz built
            start = course.parameters_of(ansatz, program)
            start[:count] = descent.parameters
            descent = course.minimise(program, start)
            if not np.isfinite(descent.energy):
                return descent.reason
            self.descents.append(descent)

    def _as_measured(self, pool: Any, descent: Descent, smallest: FloatArray) -> tuple[FloatArray, FloatArray]:
        """The slopes of the pool as a device would measure them, and what each must exceed to count.

        All operators are appended with the angle 0, where each leaves the others their slopes. Of N slopes that are nothing but noise the
        largest is about sigma sqrt(2 ln N) (Donoho and Johnstone 1994).
        """
        program = descent.problem.program
        self._course.watch.stage(f"Slopes of {len(pool)} operators")
        whole: Any = pool.grown(program, list(range(len(pool))))
        at = np.concatenate([descent.parameters, np.zeros(len(pool))])
        measured = self._course.measured_slopes(whole, at, program.n_parameters)
        if measured.variance is not None:
            smallest = np.maximum(smallest, np.sqrt(2.0 * np.log(max(len(pool), 2)) * measured.variance))
        return measured.gradient, smallest

    def _reason_to_end(self, descent: Descent) -> str:
        if descent.is_final:
            return descent.reason
        if self._ansatz.at_target and self._course.reaches_target(descent):
            return "target"
        if descent.problem.program.n_parameters >= self._ansatz.max_operators:
            return "operators"
        return self._course.spent_limit  # before the slopes, which may take more than all the rest

    def _reason_of_slopes(self, slopes: FloatArray, chosen: list[int], smallest: FloatArray) -> str:
        if float(np.linalg.norm(slopes)) < self._ansatz.least_slope:
            return "pool-slope"
        if chosen:
            return ""
        return "slope-noise" if np.any(smallest > SMALLEST_SLOPE) else "pool-slope"


def pool_slopes(problem: Problem, pool: Any, watch: Watch) -> Callable[[Any], FloatArray]:
    """State -> dE/dtheta along every operator of the pool appended to it, Eh, shape (len(pool),)."""
    from thalweg.simulate.pool_slopes import ExcitationSlopes, StringSlopes

    if isinstance(pool, ExcitationPool):
        assert problem.prepared.fermions is not None
        excitations = ExcitationSlopes(problem.prepared.fermions, pool.excitations, sector_product(problem))
        return lambda state: pool.slopes(excitations.at(state, watch))
    strings = StringSlopes(register_product(problem), pool.x, pool.z)
    return lambda state: pool.slopes(strings.at(state, watch))
