"""One start of a search: one minimisation or several after each other, counted and reported as one."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.circuit.program import Program
from thalweg.errors import Stopped
from thalweg.estimate import FREE, Slopes
from thalweg.exact.answer import ExactAnswer
from thalweg.optimize.objective import CountedObjective, Progress, StopRules
from thalweg.simulate.engine import Engine
from thalweg.study.events import AnyEvent, Iteration, StepTaken, watch_into
from thalweg.study.figures import program_gates
from thalweg.study.neighbour import begun_at
from thalweg.study.outcome import SearchEnd
from thalweg.study.problem import Problem, make_engine, target_error
from thalweg.study.result import GrowthStep, StartRecord, Trace
from thalweg.study.simulator import search_source
from thalweg.watch import Watch

#: Width of the normal displacement, in radians, of starts that would otherwise repeat themselves.
DISPLACEMENT = 0.1
#: Second word of the seed of drawn bit strings, so that they are independent of every other choice.
SAMPLING = 1
#: Reasons that end everything, not only the minimisation in which they arose.
FINAL = frozenset({"target", "evaluations", "shots", "seconds", "stopped-by-person", "not-finite"})


@dataclass(frozen=True)
class Descent:
    """One minimisation. `energy` is infinite where it was stopped before its first evaluation."""

    problem: Problem
    engine: Engine
    start: FloatArray
    reason: str
    energy: float
    parameters: FloatArray
    gradient_norm: float | None
    start_energy: float
    start_gradient_norm: float
    standard_error: float | None

    @property
    def is_final(self) -> bool:
        """Whether nothing may follow."""
        return self.reason in FINAL

    def end(self, reason: str, growth: tuple[GrowthStep, ...] = ()) -> SearchEnd:
        """The end of a course whose best point this is."""
        return SearchEnd(
            self.problem,
            self.parameters,
            self.energy,
            self.gradient_norm,
            reason,
            self.start,
            self.start_energy,
            self.start_gradient_norm,
            growth,
            self.standard_error,
        )


class Course:
    """The minimisations of one start. Iterations, evaluations and seconds run on from one to the next.

    Attributes:
        problem: the study, with the trial state that it began with.
        index, seed, rng: of this start.
        watch: asked by whatever takes long between the minimisations.
        steps: the growth so far.
    """

    def __init__(
        self,
        problem: Problem,
        exact: ExactAnswer | None,
        emit: Callable[[AnyEvent], None],
        should_stop: Callable[[], bool],
        index: int,
    ) -> None:
        self._is_concluding = False
        self._should_stop = lambda: not self._is_concluding and should_stop()
        self.problem, self.index, self.watch = problem, index, watch_into(emit, self._should_stop)
        self.seed = problem.spec.seed + index
        self.rng = np.random.default_rng(self.seed)
        self.steps: list[GrowthStep] = []
        self.exact_energy = None if exact is None else exact.energy
        self.target_energy = None if exact is None else exact.energy + target_error(problem, exact)
        self._emit = emit
        self._columns: list[Progress] = []
        self._iterations, self._spent = 0, FREE
        self._draws = np.random.default_rng([self.seed, SAMPLING])
        self._begun = time.perf_counter()

    def engine(self, program: Program) -> Engine:
        """The engine for this trial state; StudyError past the memory budget."""
        return make_engine(replace(self.problem, program=program), self.watch)

    def first_parameters(self, initial: FloatArray | None) -> FloatArray:
        """`initial` where it fits, otherwise the start of the trial state, displaced where it would repeat that of an earlier start."""
        if initial is not None and initial.shape == (self.problem.program.n_parameters,):
            return initial.copy()
        return self.parameters_of(self.problem.spec.ansatz, self.problem.program)

    def parameters_of(self, ansatz: Any, program: Any) -> FloatArray:
        """The start of this trial state (each takes the kind of program that it builds), at the parameters of another run where the
        settings name one; displaced for later starts."""
        own: FloatArray = ansatz.start_parameters(self.problem.ground, program, self.rng)
        start = begun_at(self.problem, ansatz, program, own)
        if self.index and (self.problem.spec.neighbour.is_given or ansatz.start in ("zero", "mp2", "ramp")):
            start = self.displaced(start)
        return start

    def displaced(self, start: FloatArray) -> FloatArray:
        return start + self.rng.normal(0.0, DISPLACEMENT, start.size)

    def minimise(self, program: Program, start: FloatArray, engine: Engine | None = None) -> Descent:
        """Searches from `start` by the study's optimiser. Raises Stopped only when there is no point of the whole course to keep."""
        problem = replace(self.problem, program=program)
        engine = self.engine(program) if engine is None else engine
        first: list[Progress] = []
        objective = self._objective(problem, engine, self._rules(), self.target_energy, self._reporting(first))
        reason = self._search(objective, start)
        self._conclude(objective)
        self._iterations += objective.iterations
        self._spent += objective.spent
        begin = first[0] if first else Progress(0, 0, np.inf, None, 0.0)
        return Descent(
            problem,
            engine,
            start,
            reason,
            float(objective.best_energy),
            objective.best_parameters,
            objective.best_gradient_norm,
            begin.energy,
            begin.gradient_norm or 0.0,
            objective.best_standard_error,
        )

    def _conclude(self, objective: CountedObjective) -> None:
        """The last estimate of the point that is kept; it is taken even where someone has asked to stop."""
        self._is_concluding = True
        try:
            if np.isfinite(objective.best_energy):
                objective.conclude()
        finally:
            self._is_concluding = False

    def aside(self, problem: Problem, start: FloatArray, gradient: float) -> FloatArray:
        """The best parameters for another Hamiltonian, to a gradient of `gradient` at best. Its cost is counted, its iterates are not shown."""
        rules = self._rules()
        loose = rules.model_copy(update={"gradient": max(gradient, rules.gradient), "at_target": False})
        objective = self._objective(problem, make_engine(problem, self.watch), loose, None, lambda progress: None)
        reason = self._search(objective, start)
        self._spent += objective.spent
        if reason == "stopped-by-person":
            raise Stopped(reason)
        return objective.best_parameters if np.isfinite(objective.best_energy) else start

    def measured_slopes(self, program: Program, parameters: FloatArray, first: int) -> Slopes:
        """The derivatives by the parameters from number `first` on as a device would measure them, counted.

        Raises Stopped at the time limit as well: there may be thousands of energies to measure.
        """
        problem = replace(self.problem, program=program)
        in_time = Watch(self.watch.stage, lambda: self._should_stop() or self._is_late, self.watch.warn)
        source = search_source(problem, self.engine(program), self._draws, in_time)
        try:
            slopes = source.shifted_slopes(parameters, first)
        except Stopped:
            if self._is_late and not self._should_stop():
                raise Stopped("seconds") from None
            raise
        self._spent += slopes.cost
        return slopes

    def take_step(self, descent: Descent, added: tuple[str, ...], largest_slope: float | None) -> None:
        """Records and reports what the trial state has grown to."""
        step = GrowthStep(
            added=added,
            parameters=descent.problem.program.n_parameters,
            two_qubit_gates=program_gates(descent.problem).two_qubit,
            energy=descent.energy,
            error=None if self.exact_energy is None else descent.energy - self.exact_energy,
            largest_slope=largest_slope,
            iteration=self._iterations,
            evaluations=self._spent.evaluations,
            standard_error=descent.standard_error,
        )
        self.steps.append(step)
        self._emit(StepTaken(start=self.index, number=len(self.steps) - 1, step=step))

    def reaches_target(self, descent: Descent) -> bool:
        """Whether its energy is within the target; a measured one must be so by two standard errors."""
        margin = 2 * (descent.standard_error or 0.0) if self.is_sampled else 0.0
        return self.target_energy is not None and descent.energy + margin <= self.target_energy

    @property
    def spent_limit(self) -> str:
        """Which limit of the study is used up, as a key of STOP_REASONS; empty where there is something left."""
        rules = self.problem.spec.stop
        if rules.evaluations and self._spent.evaluations >= rules.evaluations:
            return "evaluations"
        if rules.shots and self._spent.shots >= rules.shots:
            return "shots"
        return "seconds" if self._is_late else ""

    @property
    def _is_late(self) -> bool:
        seconds = self.problem.spec.stop.seconds
        return bool(seconds) and self._seconds >= seconds

    @property
    def is_sampled(self) -> bool:
        """Whether energies carry statistical noise."""
        return self.problem.spec.evaluation.is_sampled

    def record(self, end: SearchEnd) -> StartRecord:
        """Everything that was reported, and the end."""
        columns = self._columns
        trace = Trace(
            iteration=tuple(p.iteration for p in columns),
            evaluations=tuple(p.evaluations for p in columns),
            energy=tuple(p.energy for p in columns),
            gradient_norm=tuple(p.gradient_norm for p in columns),
            seconds=tuple(p.seconds for p in columns),
            circuits=tuple(p.circuits for p in columns),
            shots=tuple(p.shots for p in columns),
            standard_error=tuple(p.standard_error for p in columns),
            noiseless=tuple(p.noiseless for p in columns),
        )
        return StartRecord(
            seed=self.seed,
            energy=end.energy,
            stop_reason=end.reason,
            evaluations=self._spent.evaluations,
            iterations=self._iterations,
            gradient_norm=end.gradient_norm,
            seconds=self._seconds,
            trace=trace,
            circuits=self._spent.circuits,
            shots=self._spent.shots,
            standard_error=end.standard_error,
        )

    @property
    def _seconds(self) -> float:
        return time.perf_counter() - self._begun

    def _search(self, objective: CountedObjective, start: FloatArray) -> str:
        try:
            self._refuse_spent()
            objective.begin(start)
            if objective.n_parameters == 0:
                return "no-parameters"
            return self.problem.spec.optimizer.minimise(objective, start, self.rng)
        except Stopped as stop:
            if not np.isfinite(objective.best_energy) and not self._columns:
                raise
            return stop.reason

    def _reporting(self, first: list[Progress]) -> Callable[[Progress], None]:
        """Shows iterates with the counts of the whole course, and keeps them; `first` takes all of this minimisation."""
        iterations, spent, seconds = self._iterations, self._spent, self._seconds

        def report(progress: Progress) -> None:
            first.append(progress)
            if progress.iteration == 0 and self._columns:
                return  # a later minimisation begins where the last one ended
            moved = replace(
                progress,
                iteration=progress.iteration + iterations,
                evaluations=progress.evaluations + spent.evaluations,
                circuits=progress.circuits + spent.circuits,
                shots=progress.shots + spent.shots,
                seconds=progress.seconds + seconds,
            )
            self._columns.append(moved)
            self._emit(Iteration(start=self.index, **vars(moved)))

        return report

    def _objective(
        self, problem: Problem, engine: Engine, rules: StopRules, target_energy: float | None, report: Callable[[Progress], None]
    ) -> CountedObjective:
        return CountedObjective(
            search_source(problem, engine, self._draws, self.watch),
            offset=self.problem.prepared.reference_energy,
            rules=rules,
            target_energy=target_energy,
            report=report,
            should_stop=self._should_stop,
        )

    def _rules(self) -> StopRules:
        """The study's rules, less what the course has spent already."""
        rules = self.problem.spec.stop
        evaluations = max(1, rules.evaluations - self._spent.evaluations) if rules.evaluations else 0
        shots = max(1, rules.shots - self._spent.shots) if rules.shots else 0
        seconds = max(1e-9, rules.seconds - self._seconds) if rules.seconds else 0.0
        return rules.model_copy(update={"evaluations": evaluations, "shots": shots, "seconds": seconds})

    def _refuse_spent(self) -> None:
        """Raises Stopped where a limit is used up; the first minimisation that is shown has one evaluation at least."""
        if self._columns and self.spent_limit:
            raise Stopped(self.spent_limit)
