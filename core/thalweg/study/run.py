"""One study from settings to result: prepare, diagonalise, minimise from each start, judge."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import Stopped
from thalweg.exact.answer import ExactAnswer
from thalweg.optimize.objective import CountedObjective, Progress
from thalweg.simulate.engine import Engine
from thalweg.study.assemble import assemble
from thalweg.study.events import AnyEvent, Finished, Iteration, Started, Warned, watch_into
from thalweg.study.figures import warnings_of
from thalweg.study.outcome import Outcome
from thalweg.study.point_seed import PointSeed
from thalweg.study.problem import Problem, exact_answer, make_engine, prepare, target_error
from thalweg.study.result import StartRecord, StudyResult, Trace
from thalweg.study.spec import StudySpec

#: Width of the normal displacement, in radians, of every start after the first when the ansatz itself starts at a fixed point.
DISPLACEMENT = 0.1


def never() -> bool:
    return False


def run(spec: StudySpec, emit: Callable[[AnyEvent], None] = lambda event: None, should_stop: Callable[[], bool] = never) -> StudyResult:
    """Runs one study and returns its result, which is also emitted as `Finished`.

    Raises StudyError for what a person can mend, and Stopped when stopped before there is a best point to keep.
    """
    result, _ = run_from(spec, None, emit, should_stop)
    emit(Finished(result=result))
    return result


def run_from(
    spec: StudySpec,
    seed: PointSeed | None,
    emit: Callable[[AnyEvent], None] = lambda event: None,
    should_stop: Callable[[], bool] = never,
) -> tuple[StudyResult, PointSeed]:
    """As `run`, from a neighbour's seed where there is one; also returns the seed for the next neighbour."""
    watch = watch_into(emit, should_stop)
    problem = prepare(spec, watch, seed.mean_field if seed is not None else None)
    for text in warnings_of(problem):
        emit(Warned(text=text))
    exact = exact_answer(problem, watch)
    engine = make_engine(problem, watch)
    emit(_started(problem, exact))
    watch.stage("Minimising")
    minimisation = Minimisation(problem, engine, exact, emit, should_stop)
    minimisation.run(None if seed is None else seed.parameters_for(problem.program))
    result = assemble(problem, exact, engine, minimisation.outcome())
    return result, PointSeed(problem.prepared.seed, result.final_parameters, result.parameter_labels)


class Minimisation:
    """Minimises from every start in turn; the lowest counts."""

    def __init__(
        self, problem: Problem, engine: Engine, exact: ExactAnswer | None, emit: Callable[[AnyEvent], None], should_stop: Callable[[], bool]
    ) -> None:
        self._problem, self._engine, self._exact, self._emit, self._should_stop = problem, engine, exact, emit, should_stop
        self._outcome = Outcome()

    def outcome(self) -> Outcome:
        return self._outcome

    def run(self, initial: FloatArray | None) -> None:
        for index in range(self._problem.spec.starts):
            if index and self._should_stop():
                break
            self._one_start(index, initial if index == 0 else None)

    def _one_start(self, index: int, initial: FloatArray | None) -> None:
        spec = self._problem.spec
        seed = spec.seed + index
        rng = np.random.default_rng(seed)
        start = self._start_parameters(index, initial, rng)
        columns: list[Progress] = []

        def report(progress: Progress) -> None:
            columns.append(progress)
            self._emit(Iteration(start=index, **vars(progress)))

        objective = self._objective(report)
        reason = self._search(objective, start, rng)
        out = self._outcome
        out.starts.append(_record(seed, reason, objective, columns))
        out.best_parameters.append(objective.best_parameters)
        out.start_parameters.append(start)
        out.start_energies.append(columns[0].energy)
        out.start_gradient_norms.append(columns[0].gradient_norm or 0.0)

    def _search(self, objective: CountedObjective, start: FloatArray, rng: np.random.Generator) -> str:
        try:
            objective.begin(start)
            if objective.n_parameters == 0:
                return "no-parameters"
            return self._problem.spec.optimizer.minimise(objective, start, rng)
        except Stopped as stop:
            if not np.isfinite(objective.best_energy):
                raise
            return stop.reason

    def _objective(self, report: Callable[[Progress], None]) -> CountedObjective:
        spec = self._problem.spec
        target = None if self._exact is None else self._exact.energy + target_error(self._problem, self._exact)
        return CountedObjective(
            self._engine.energy,
            self._engine.energy_and_gradient,
            self._engine.n_parameters,
            offset=self._problem.prepared.reference_energy,
            rules=spec.stop,
            target_energy=target,
            report=report,
            should_stop=self._should_stop,
        )

    def _start_parameters(self, index: int, initial: FloatArray | None, rng: np.random.Generator) -> FloatArray:
        problem = self._problem
        if initial is not None and initial.shape == (self._engine.n_parameters,):
            return initial.copy()
        ansatz: Any = problem.spec.ansatz  # each one takes the kind of program that it builds
        start: FloatArray = ansatz.start_parameters(problem.ground, problem.program, rng)
        if index and ansatz.start in ("zero", "mp2"):  # a fixed point would repeat itself
            start = start + rng.normal(0.0, DISPLACEMENT, start.size)
        return start


def _record(seed: int, reason: str, objective: CountedObjective, columns: list[Progress]) -> StartRecord:
    trace = Trace(
        iteration=tuple(p.iteration for p in columns),
        evaluations=tuple(p.evaluations for p in columns),
        energy=tuple(p.energy for p in columns),
        gradient_norm=tuple(p.gradient_norm for p in columns),
        seconds=tuple(p.seconds for p in columns),
    )
    return StartRecord(
        seed=seed,
        energy=objective.best_energy,
        stop_reason=reason,
        evaluations=objective.evaluations,
        iterations=objective.iterations,
        gradient_norm=objective.best_gradient_norm,
        seconds=objective.seconds,
        trace=trace,
    )


def _started(problem: Problem, exact: ExactAnswer | None) -> Started:
    prepared, spec = problem.prepared, problem.spec
    return Started(
        label=prepared.label,
        energy_unit=prepared.energy_unit,
        reference_name=prepared.reference_name,
        reference_energy=prepared.reference_energy,
        exact_energy=None if exact is None else exact.energy,
        target_error=target_error(problem, exact),
        n_parameters=problem.program.n_parameters,
        n_starts=spec.starts,
    )
