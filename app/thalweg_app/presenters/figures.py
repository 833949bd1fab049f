"""Keeps the derived figures of the set-up: worked out elsewhere, dimmed while stale, never wrong."""

from __future__ import annotations

from collections import OrderedDict
from typing import Any

from thalweg.errors import StudyError
from thalweg.study.derived import StudyFigures
from thalweg.study.events import Failed
from thalweg.study.spec import StudySpec
from thalweg_app.presenters.jobs import INSPECT, Job, JobListener, JobStarter
from thalweg_app.presenters.listeners import Listeners

#: Sets of figures kept, so that undo shows them at once.
KEPT = 24


class DerivedFigures:
    """`follow` with every change of the set-up, then `inspect` after a short rest; a newer request replaces an older one."""

    def __init__(self, starter: JobStarter, function: str = INSPECT) -> None:
        self._starter, self._function = starter, function
        self._kept: OrderedDict[Any, StudyFigures] = OrderedDict()
        self._wanted: StudySpec | None = None
        self._job: Job | None = None
        self._asked: Any = None
        self.shown: StudyFigures | None = None
        self.is_fresh = False
        self.changed = Listeners()
        self.needed = Listeners()  # the view answers with `inspect` after a short rest
        self.refused = Listeners()  # (spec, StudyError)
        self.defect = Listeners()  # (Failed)

    def follow(self, spec: StudySpec | None) -> None:
        """The set-up is now this; None when it has no system or does not validate."""
        self._wanted = spec
        if spec is None:
            self._withdraw()
            self._set(None if self.shown is None else self.shown, False)
        elif (key := key_of(spec)) in self._kept:
            self._withdraw()
            self._set(self._kept[key], True)
        elif key != self._asked:
            self._withdraw()
            self._set(self.shown, False)
            self.needed()

    def inspect(self) -> None:
        """Asks for the figures of the latest set-up."""
        spec = self._wanted
        if spec is None or key_of(spec) in self._kept or key_of(spec) == self._asked:
            return
        self._withdraw()
        self._asked = key = key_of(spec)
        listener = JobListener(
            done=lambda value: self._on_done(key, value),
            failed=lambda failure: self._on_failed(key, failure),
            stopped=lambda: self._over(key),
        )
        self._job = self._starter.start(self._function, spec.model_dump(mode="json"), listener)

    def of(self, spec: StudySpec) -> StudyFigures | None:
        """Figures of these settings where they are known."""
        return self._kept.get(key_of(spec))

    def _on_done(self, key: Any, value: Any) -> None:
        figures = StudyFigures.model_validate(value)
        self._kept[key] = figures
        while len(self._kept) > KEPT:
            self._kept.popitem(last=False)
        self._over(key)
        if self._wanted is not None and key == key_of(self._wanted):
            self._set(figures, True)

    def _on_failed(self, key: Any, failure: Failed) -> None:
        """The refusal is of the set-up as it is now, in which e.g. the seed may have changed since."""
        self._over(key)
        if self._wanted is None or key != key_of(self._wanted):
            return
        if failure.details:
            self.defect(failure)
        else:
            self.refused(self._wanted, StudyError(failure.what, failure.why, failure.fix, failure.field))
        self.changed()

    def _over(self, key: Any) -> None:
        if self._asked == key:
            self._asked, self._job = None, None

    def _withdraw(self) -> None:
        if self._job is not None:
            job, self._job, self._asked = self._job, None, None
            job.stop()

    def _set(self, figures: StudyFigures | None, fresh: bool) -> None:
        self.shown, self.is_fresh = figures, fresh
        self.changed()


def key_of(spec: StudySpec) -> Any:
    """What the figures depend on; seeds, starts, the target and stop rules leave them fresh."""
    start = (spec.neighbour, spec.ladder, spec.continuation) if spec.neighbour.is_given else None  # what may refuse or move the start
    search = (spec.optimizer, spec.evaluation)
    return spec.system, spec.encoding, spec.ansatz, spec.reference, start, search, spec.memory_gib, spec.exact
