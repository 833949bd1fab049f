"""A run while it runs: what its events have told so far."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from thalweg.study.events import AnyEvent, Finished, Iteration, Stage, Started, Warned
from thalweg.study.result import StudyResult
from thalweg.study.spec import StudySpec


@dataclass
class LiveStart:
    """Columns of one start, growing."""

    iteration: list[int] = field(default_factory=list)
    evaluations: list[int] = field(default_factory=list)
    energy: list[float] = field(default_factory=list)
    gradient_norm: list[float | None] = field(default_factory=list)
    seconds: list[float] = field(default_factory=list)
    circuits: list[int] = field(default_factory=list)
    shots: list[int] = field(default_factory=list)
    standard_error: list[float | None] = field(default_factory=list)
    noiseless: list[float | None] = field(default_factory=list)

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
    """Fed with events; `check_of` is the number of the ledger's run that is repeated, None for a new run."""

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
        places = [(s.energy[i], k, i) for k, s in enumerate(self.starts) for i in [min(range(len(s.energy)), key=s.energy.__getitem__)]]
        return min(places)[1:] if places else None

    def _iterate(self, event: Iteration) -> None:
        while len(self.starts) <= event.start:
            self.starts.append(LiveStart())
        self.starts[event.start].add(event)
