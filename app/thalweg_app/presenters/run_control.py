"""Runs studies one after the other: a queue, the run that is under way, and what comes of it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from thalweg.errors import StudyError
from thalweg.study.derived import StudyFigures
from thalweg.study.events import AnyEvent, Failed
from thalweg.study.result import StudyResult
from thalweg.study.spec import StudySpec
from thalweg_app.presenters.jobs import RUN, Job, JobListener, JobStarter
from thalweg_app.presenters.listeners import Listeners
from thalweg_app.presenters.live import LiveRun
from thalweg_app.presenters.partial import partial_result


@dataclass(frozen=True)
class Queued:
    """A run that waits; `check_of` as in LiveRun."""

    spec: StudySpec
    check_of: int | None = None


class RunControl:
    """`changed`: a run began, ended, or the queue changed. `progressed`: the run under way told something."""

    def __init__(self, starter: JobStarter, figures_of: Callable[[StudySpec], StudyFigures | None], function: str = RUN) -> None:
        self._starter, self._figures_of, self._function = starter, figures_of, function
        self._job: Job | None = None
        self.live: LiveRun | None = None
        self.queue: list[Queued] = []
        self.changed = Listeners()
        self.progressed = Listeners()
        self.finished = Listeners()  # (StudyResult): a new run for the ledger
        self.checked = Listeners()  # (number, StudyResult): a run of the ledger repeated
        self.told = Listeners()  # (sentence): something went wrong that the person should know
        self.refused = Listeners()  # (spec, StudyError)
        self.defect = Listeners()  # (Failed)

    @property
    def is_running(self) -> bool:
        return self.live is not None

    def submit(self, spec: StudySpec, check_of: int | None = None) -> None:
        """Runs these settings now, or after the runs that wait already."""
        self.queue.append(Queued(spec, check_of))
        self._next()
        self.changed()

    def stop(self) -> None:
        """Ends the run under way and keeps its best point; the next in the queue follows."""
        if self._job is not None and self.live is not None and not self.live.is_stopping:
            self.live.is_stopping = True
            self._job.stop()
            self.changed()

    def stop_all(self) -> None:
        self.queue.clear()
        self.stop()
        self.changed()

    def withdraw(self, position: int) -> None:
        """Takes a waiting run off the queue."""
        if 0 <= position < len(self.queue):
            del self.queue[position]
            self.changed()

    def _next(self) -> None:
        if self.live is not None or not self.queue:
            return
        queued = self.queue.pop(0)
        live = self.live = LiveRun(queued.spec, queued.check_of)
        listener = JobListener(
            events=lambda events: self._on_events(live, events),
            done=lambda value: self._on_done(live),
            failed=lambda failure: self._on_failed(live, failure),
            stopped=lambda: self._on_stopped(live),
        )
        self._job = self._starter.start(self._function, queued.spec.model_dump(mode="json"), listener)

    def _on_events(self, live: LiveRun, events: Sequence[AnyEvent]) -> None:
        live.take(events)
        self.progressed()

    def _on_done(self, live: LiveRun) -> None:
        result = live.result
        self._clear()
        if result is None:
            self.defect(Failed(what="The run ended without a result", why="the calculation handed nothing over"))
        else:
            self._hand_over(live, result)
        self._go_on()

    def _on_stopped(self, live: LiveRun) -> None:
        result = live.result or partial_result(live, self._figures_of(live.spec), "stopped-by-person")
        self._clear()
        if result is not None:
            self._hand_over(live, result)
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
            self._hand_over(live, partial)
        self._go_on()

    def _hand_over(self, live: LiveRun, result: StudyResult) -> None:
        if live.check_of is None:
            self.finished(result)
        else:
            self.checked(live.check_of, result)

    def _clear(self) -> None:
        self.live, self._job = None, None

    def _go_on(self) -> None:
        self._next()
        self.changed()
