"""One study from settings to result: prepare, diagonalise, minimise from each start, judge."""

from __future__ import annotations

from collections.abc import Callable, Collection

from thalweg.ansatz.adaptive import Adaptive
from thalweg.arrays import FloatArray
from thalweg.exact.answer import ExactAnswer
from thalweg.study.afresh import measured_afresh
from thalweg.study.assemble import assemble
from thalweg.study.events import AnyEvent, Finished, Started, Warned, watch_into
from thalweg.study.executors import Local
from thalweg.study.figures import warnings_of
from thalweg.study.neighbour import refuse_unfit_start, start_words
from thalweg.study.point_seed import PointSeed
from thalweg.study.problem import Problem, exact_answer, prepare, target_error
from thalweg.study.result import StudyResult
from thalweg.study.simulator import refuse_unfit
from thalweg.study.site_figures import exact_site_figures
from thalweg.study.spec import StudySpec
from thalweg.study.starts import run_starts


def never() -> bool:
    return False


def run(
    spec: StudySpec,
    emit: Callable[[AnyEvent], None] = lambda event: None,
    should_stop: Callable[[], bool] = never,
    local: Local | None = None,
    only: Collection[int] | None = None,
) -> StudyResult:
    """Runs one study and returns its result, which is also emitted as `Finished`.

    `local` lets several starts run side by side where that pays, `only` names those to run, counted from 0; the result is the same to the
    last digit, but for its times. Raises StudyError for what a person can mend, and Stopped when stopped before there is a best point to
    keep.
    """
    result, _ = run_from(spec, None, emit, should_stop, local, only)
    emit(Finished(result=result))
    return result


def run_from(
    spec: StudySpec,
    seed: PointSeed | None,
    emit: Callable[[AnyEvent], None] = lambda event: None,
    should_stop: Callable[[], bool] = never,
    local: Local | None = None,
    only: Collection[int] | None = None,
) -> tuple[StudyResult, PointSeed]:
    """As `run`, from a neighbour's seed where there is one; also returns the seed for the next neighbour."""
    watch = watch_into(emit, should_stop)
    problem = prepare(spec, watch, seed.mean_field if seed is not None else None)
    refuse_unfit(problem)
    refuse_unfit_start(problem)
    initial = None if seed is None else seed.parameters_for(problem.program)
    begins = () if _takes(spec, initial) else start_words(problem)
    for text in warnings_of(problem) + begins:
        emit(Warned(text=text))
    exact = exact_answer(problem, watch)
    exact_sites = exact_site_figures(problem, exact, watch)
    emit(_started(problem, exact, spec.starts if only is None else 1 + max(only)))
    watch.stage("Minimising")
    outcome = measured_afresh(run_starts(problem, exact, initial, emit, should_stop, local, only))
    result = assemble(exact, exact_sites, outcome, begins)
    return result, PointSeed(problem.prepared.seed, result.final_parameters, result.parameter_labels)


def _takes(spec: StudySpec, initial: FloatArray | None) -> bool:
    """Whether the first start begins at `initial`: what grows or climbs begins at its own beginning."""
    return initial is not None and not isinstance(spec.ansatz, Adaptive) and not spec.ladder.on


def _started(problem: Problem, exact: ExactAnswer | None, n_starts: int) -> Started:
    prepared = problem.prepared
    return Started(
        label=prepared.label,
        energy_unit=prepared.energy_unit,
        reference_name=prepared.reference_name,
        reference_energy=prepared.reference_energy,
        exact_energy=None if exact is None else exact.energy,
        target_error=target_error(problem, exact),
        n_parameters=problem.program.n_parameters,
        n_starts=n_starts,
    )
