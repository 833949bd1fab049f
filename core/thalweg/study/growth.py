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
    best = min(growing.descents, key=lambda descent: descent.energy)
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
            self._take_step(descent, added, float(np.abs(slopes).max(initial=0.0)))
            chosen = ansatz.choose(slopes, barred, SMALLEST_SLOPE)
            reason = self._reason_to_end(descent, slopes, chosen)
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

    def _take_step(self, descent: Descent, added: tuple[str, ...], largest: float) -> None:
        if not self._course.steps:
            self.first_slope = largest
        self._course.take_step(descent, added, largest)

    def _reason_to_end(self, descent: Descent, slopes: FloatArray, chosen: list[int]) -> str:
        if descent.is_final:
            return descent.reason
        if self._ansatz.at_target and self._course.reaches_target(descent.energy):
            return "target"
        if float(np.linalg.norm(slopes)) < self._ansatz.least_slope or not chosen:
            return "pool-slope"
        if descent.problem.program.n_parameters >= self._ansatz.max_operators:
            return "operators"
        return ""


def pool_slopes(problem: Problem, pool: Any, watch: Watch) -> Callable[[Any], FloatArray]:
    """State -> dE/dtheta along every operator of the pool appended to it, Eh, shape (len(pool),)."""
    from thalweg.simulate.pool_slopes import ExcitationSlopes, StringSlopes

    if isinstance(pool, ExcitationPool):
        assert problem.prepared.fermions is not None
        excitations = ExcitationSlopes(problem.prepared.fermions, pool.excitations, sector_product(problem))
        return lambda state: pool.slopes(excitations.at(state, watch))
    strings = StringSlopes(register_product(problem), pool.x, pool.z)
    return lambda state: pool.slopes(strings.at(state, watch))
