"""Runs studies one after the other: a queue, the run that is under way, and what comes of it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from thalweg.errors import StudyError
from thalweg.storage.session import Run
from thalweg.study.derived import StudyFigures
from thalweg.study.events import AnyEvent, Failed
from thalweg.study.spec import StudySpec
from thalweg_app.presenters.jobs import CHECK, RUN, Job, JobListener, JobStarter
from thalweg_app.presenters.listeners import Listeners
from thalweg_app.presenters.live import LiveRun
from thalweg_app.presenters.partial import partial_result


@dataclass(frozen=True)
class Queued:
    """A run that waits: of new settings, or the repetition of a run of the ledger."""

    spec: StudySpec
    check_of: Run | None = None


@dataclass(frozen=True)
class CheckOutcome:
    """What came of repeating a run; the deviation in the unit of its energies, None when it was stopped on the way."""

    number: int
    unit: str
    deviation: float | None
    compared: str = ""


class RunControl:
    """`changed`: a run began, ended, or the queue changed. `progressed`: the run under way told something."""

    def __init__(
        self, starter: JobStarter, figures_of: Callable[[StudySpec], StudyFigures | None], function: str = RUN, check_function: str = CHECK
    ) -> None:
        self._starter, self._figures_of, self._function, self._check_function = starter, figures_of, function, check_function
        self._job: Job | None = None
        self.live: LiveRun | None = None
        self.queue: list[Queued] = []
        self.changed = Listeners()
        self.progressed = Listeners()
        self.finished = Listeners()  # (StudyResult): a new run for the ledger
        self.checked = Listeners()  # (CheckOutcome): a run of the ledger repeated
        self.told = Listeners()  # (sentence): something went wrong that the person should know
        self.refused = Listeners()  # (spec, StudyError)
        self.defect = Listeners()  # (Failed)

    @property
    def is_running(self) -> bool:
        return self.live is not None

    def submit(self, spec: StudySpec) -> None:
        """Runs these settings now, or after the runs that wait already."""
        self._enqueue(Queued(spec))

    def check(self, run: Run) -> None:
        """Repeats a run of the ledger; its row stays as it is."""
        self._enqueue(Queued(run.result.spec, run))

    def stop(self) -> None:
        """Ends the run under way and keeps its best point; asked again, does not wait for its properties. The next in the queue follows."""
        if self._job is not None and self.live is not None:
            self.live.is_stopping = True
            self._job.stop()
            self.changed()

    def stop_all(self) -> None:
        self.queue.clear()
        self.stop()
        self.changed()

    def withdraw(self, queued: Queued) -> None:
        """Takes a run off the queue, if it still waits."""
        if any(waiting is queued for waiting in self.queue):
            self.queue = [waiting for waiting in self.queue if waiting is not queued]
            self.changed()

    def _enqueue(self, queued: Queued) -> None:
        self.queue.append(queued)
        self._next()
        self.changed()

    def _next(self) -> None:
        if self.live is not None or not self.queue:
            return
        queued = self.queue.pop(0)
        checked = queued.check_of
        live = self.live = LiveRun(queued.spec, None if checked is None else checked.number)
        listener = JobListener(
            events=lambda events: self._on_events(live, events),
            noticed=lambda: self._on_noticed(live),
            done=lambda value: self._on_done(live) if checked is None else self._on_checked(live, checked, value),
            failed=lambda failure: self._on_failed(live, failure),
            stopped=lambda: self._on_stopped(live),
        )
        if checked is None:
            self._job = self._starter.start(self._function, queued.spec.model_dump(mode="json"), listener)
        else:
            self._job = self._starter.start(self._check_function, checked.result.model_dump(mode="json"), listener)

    def _on_events(self, live: LiveRun, events: Sequence[AnyEvent]) -> None:
        live.take(events)
        self.progressed()

    def _on_noticed(self, live: LiveRun) -> None:
        live.has_noticed = True
        self.progressed()

    def _on_done(self, live: LiveRun) -> None:
        result = live.result
        self._clear()
        if result is None:
            self.defect(Failed(what="The run ended without a result", why="the calculation handed nothing over"))
        else:
            self.finished(result)
        self._go_on()

    def _on_checked(self, live: LiveRun, run: Run, value: Any) -> None:
        self._clear()
        unit = run.result.energy_unit
        if value is None:
            self.checked(CheckOutcome(run.number, unit, None))
        else:
            worst = max(value["deviation"], value["exact_deviation"] or 0.0)
            self.checked(CheckOutcome(run.number, unit, worst, value["compared"]))
        self._go_on()

    def _on_stopped(self, live: LiveRun) -> None:
        result = live.result or partial_result(live, self._figures_of(live.spec), "stopped-by-person")
        self._clear()
        if live.check_of is not None:
            self.told(f"The check of run {live.check_of} was stopped.")
        elif result is not None:
            self.finished(result)
        else:
            self.told("Stopped before there was any point to keep.")
        self._go_on()

    def _on_failed(self, live: LiveRun, failure: Failed) -> None:
        partial = partial_result(live, self._figures_of(live.spec), "cut-off")
        self._clear()
        if failure.fix:
            error = StudyError(failure.what, failure.why, failure.fix, failure.field)
            self.told(str(error))
            if not failure.details:
                self.refused(live.spec, error)
        else:
            self.defect(failure)
        if partial is not None and live.check_of is None:
            self.finished(partial)
        self._go_on()

    def _clear(self) -> None:
        self.live, self._job = None, None

    def _go_on(self) -> None:
        self._next()
        self.changed()
