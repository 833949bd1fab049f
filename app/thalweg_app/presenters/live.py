"""A run while it runs: what its events have told so far."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from thalweg.study.events import AnyEvent, Finished, Iteration, Stage, Started, StartEnded, Warned
from thalweg.study.result import StudyResult
from thalweg.study.spec import StudySpec


@dataclass
class LiveStart:
    """Columns of one start, growing; empty while it has not been heard of."""

    iteration: list[int] = field(default_factory=list)
    evaluations: list[int] = field(default_factory=list)
    energy: list[float] = field(default_factory=list)
    gradient_norm: list[float | None] = field(default_factory=list)
    seconds: list[float] = field(default_factory=list)
    circuits: list[int] = field(default_factory=list)
    shots: list[int] = field(default_factory=list)
    standard_error: list[float | None] = field(default_factory=list)
    noiseless: list[float | None] = field(default_factory=list)
    reason: str = ""  # why it ended

    def add(self, event: Iteration) -> None:
        self.iteration.append(event.iteration)
        self.evaluations.append(event.evaluations)
        self.energy.append(event.energy)
        self.gradient_norm.append(event.gradient_norm)
        self.seconds.append(event.seconds)
        self.circuits.append(event.circuits)
        self.shots.append(event.shots)
        self.standard_error.append(event.standard_error)
        self.noiseless.append(event.noiseless)


@dataclass
class LiveRun:
    """Fed with events; `check_of` is the number of the ledger's run that is repeated, None for a new run.

    Starts may run side by side, so that their events come in turn; `starts` are in the order of their numbers.
    """

    spec: StudySpec
    check_of: int | None = None
    started: Started | None = None
    stage: str = ""
    fraction: float | None = None
    starts: list[LiveStart] = field(default_factory=list)
    warnings: list[str] = field(default_factory=list)
    result: StudyResult | None = None
    is_stopping: bool = False
    has_noticed: bool = False  # the search has ended, the best point is being examined

    def take(self, events: Sequence[AnyEvent]) -> None:
        for event in events:
            if isinstance(event, Iteration):
                self._iterate(event)
            elif isinstance(event, StartEnded):
                self._start(event.start).reason = event.reason
            elif isinstance(event, Stage):
                self.stage, self.fraction = event.text, event.fraction
            elif isinstance(event, Started):
                self.started = event
            elif isinstance(event, Warned):
                self.warnings.append(event.text)
            elif isinstance(event, Finished):
                self.result = event.result

    @property
    def best(self) -> tuple[int, int] | None:
        """(start, position in its columns) of the lowest energy; None before the first iterate."""
        begun = [(s, k) for k, s in enumerate(self.starts) if s.energy]
        places = [(s.energy[i], k, i) for s, k in begun for i in [min(range(len(s.energy)), key=s.energy.__getitem__)]]
        return min(places)[1:] if places else None

    @property
    def n_starts(self) -> int:
        return self.spec.starts if self.started is None else self.started.n_starts

    @property
    def running(self) -> list[int]:
        """The starts under way that have told an iterate."""
        return [k for k, s in enumerate(self.starts) if s.energy and not s.reason]

    @property
    def ended(self) -> int:
        """How many starts have come to their end."""
        return sum(bool(s.reason) for s in self.starts)

    @property
    def lead(self) -> int | None:
        """The start to be looked at: the first of those under way, so that it stays the same until its end; then the best one."""
        if self.running:
            return self.running[0]
        return None if self.best is None else self.best[0]

    def _start(self, number: int) -> LiveStart:
        while len(self.starts) <= number:
            self.starts.append(LiveStart())
        return self.starts[number]

    def _iterate(self, event: Iteration) -> None:
        if event.iteration == 0 and self._start(event.start).energy:
            self.starts[event.start] = LiveStart()  # its process was lost, and it begins anew
        self._start(event.start).add(event)
