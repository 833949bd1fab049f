"""One start of a study, from its first parameters to its end."""

from __future__ import annotations

from collections.abc import Callable

from thalweg.ansatz.adaptive import Adaptive
from thalweg.arrays import FloatArray
from thalweg.exact.answer import ExactAnswer
from thalweg.study.continuation import follow
from thalweg.study.course import Course
from thalweg.study.depth_ladder import climb
from thalweg.study.events import AnyEvent
from thalweg.study.growth import grow
from thalweg.study.outcome import SearchEnd
from thalweg.study.problem import Problem
from thalweg.study.result import StartRecord


def run_start(
    problem: Problem,
    exact: ExactAnswer | None,
    index: int,
    initial: FloatArray | None,
    emit: Callable[[AnyEvent], None],
    should_stop: Callable[[], bool],
) -> tuple[StartRecord, SearchEnd]:
    """Start `index`, counted from 0; it depends on the study and on `index` alone. Raises Stopped before its first energy, and StudyError."""
    course = Course(problem, exact, emit, should_stop, index)
    end = search(course, initial)
    return course.record(end), end


def search(course: Course, initial: FloatArray | None) -> SearchEnd:
    """One start by the way that the settings name: growth, a depth ladder, continuation, or one minimisation of a fixed trial state."""
    spec = course.problem.spec
    if isinstance(spec.ansatz, Adaptive):
        return grow(course, spec.ansatz)
    if spec.ladder.on:
        return climb(course)
    if spec.continuation > 1 and initial is None:
        return follow(course, spec.continuation)
    descent = course.minimise(course.problem.program, course.first_parameters(initial))
    return descent.end(descent.reason)
