"""Repeats a run with its own settings and seed, and states how far the second answer lies from the first."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from thalweg.study.events import AnyEvent, Iteration, StartEnded
from thalweg.study.executors import Local
from thalweg.study.result import Record, StudyResult
from thalweg.study.run import never, run

#: Ends that depend on the person or on the speed of the machine, so that a repetition must be ended at the same iterate.
OUTER_ENDS = frozenset({"stopped-by-person", "seconds"})


class Repetition(Record):
    """The second answer and its distance from the first, in the result's energy unit.

    Attributes:
        result: the second result.
        deviation: |second energy - first energy|; for a run that was ended from outside, of the lowest iterates.
        exact_deviation: the same of the exact energies; None where there is none.
        compared: what was compared, in words.
    """

    result: StudyResult
    deviation: float
    exact_deviation: float | None
    compared: str

    def within(self, tolerance: float) -> bool:
        return self.deviation <= tolerance and (self.exact_deviation or 0.0) <= tolerance


def repeat(
    first: StudyResult,
    emit: Callable[[AnyEvent], None] = lambda event: None,
    should_stop: Callable[[], bool] = never,
    local: Local | None = None,
) -> Repetition | None:
    """Runs the starts of `first` again; None when stopped on the way. Raises what `run` raises. `local` as for `run`.

    A start that was ended by hand or by the clock is ended after the same number of iterations, and its lowest iterates are compared;
    starts then run one after another, as each is to be ended apart.
    """
    ends = OuterEnds(first)
    stop_rules = first.spec.stop.model_copy(update={"seconds": 0.0})
    spec = first.spec.model_copy(update={"stop": stop_rules})

    def watch(event: AnyEvent) -> None:
        ends.take(event)
        emit(event)

    asked = False

    def stop() -> bool:
        nonlocal asked
        asked = asked or should_stop()
        return asked or ends.due()

    second = run(spec, watch, stop, None if ends else local, list(numbers_of_starts(first)))
    if asked:
        return None
    return _compare(first, second, outer=bool(ends))


def numbers_of_starts(result: StudyResult) -> Iterator[int]:
    """Which starts of its study, counted from 0, the result has; some may have been lost or never begun."""
    return (start.seed - result.seed for start in result.starts)


class OuterEnds:
    """Says once, at the recorded iterate of each start that was ended from outside, that it is time to end."""

    def __init__(self, first: StudyResult) -> None:
        starts = zip(numbers_of_starts(first), first.starts, strict=True)
        self._last = {index: start.iterations for index, start in starts if start.stop_reason in OUTER_ENDS}
        self._due = False

    def __bool__(self) -> bool:
        return bool(self._last)

    def take(self, event: AnyEvent) -> None:
        if isinstance(event, Iteration) and event.iteration >= self._last.get(event.start, event.iteration + 1):
            self._due = True
        elif isinstance(event, StartEnded):
            self._due = False  # it ended by itself there, and the next one is not meant

    def due(self) -> bool:
        due, self._due = self._due, False
        return due


def _compare(first: StudyResult, second: StudyResult, *, outer: bool) -> Repetition:
    if outer:
        deviation, compared = abs(lowest_iterate(second, first) - lowest_iterate(first, first)), "lowest iterate of a run that was ended from outside"
    else:
        deviation, compared = abs(second.energy - first.energy), "energy"
    exact = None
    if first.exact_energy is not None and second.exact_energy is not None:
        exact = abs(second.exact_energy - first.exact_energy)
    return Repetition(result=second, deviation=deviation, exact_deviation=exact, compared=compared)


def lowest_iterate(result: StudyResult, first: StudyResult) -> float:
    """The lowest energy among the iterates of all starts, as far as each start of `first` went."""
    pairs = zip(result.starts, first.starts, strict=True)
    return min(energy for start, until in pairs for energy in start.trace.energy[: until.iterations + 1])
