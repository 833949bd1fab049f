"""What the terminal shows while a study runs: a live line on a screen, plain lines in a pipe. Everything goes to standard error."""

from __future__ import annotations

import sys
import time
from typing import Any, Protocol

from thalweg.study.events import AnyEvent, Iteration, Stage, Started, Warned
from thalweg.study.spec import StudySpec
from thalweg_app.presenters.wording import difference_factor, significant, time_left, unit_name
from thalweg_app.progress import StudyProgress

#: Seconds between two plain lines of iterations.
LINE_INTERVAL = 2.0


class Display(Protocol):
    """Consumes the events of a study. A context manager, so that the cursor always comes back."""

    def __enter__(self) -> Display: ...

    def __exit__(self, *details: object) -> None: ...

    def take(self, event: AnyEvent) -> None: ...

    def tick(self) -> None:
        """Called some times a second, also while no event comes."""
        ...

    def say(self, text: str) -> None: ...


def make_display(spec: StudySpec, *, quiet: bool = False) -> Display:
    if quiet:
        return SilentDisplay()
    return LiveDisplay(spec) if sys.stderr.isatty() else LineDisplay(spec)


class SilentDisplay:
    """Shows nothing but what must be said."""

    def __enter__(self) -> SilentDisplay:
        return self

    def __exit__(self, *details: object) -> None:
        return None

    def take(self, event: AnyEvent) -> None:
        return None

    def tick(self) -> None:
        return None

    def say(self, text: str) -> None:
        print(text, file=sys.stderr, flush=True)


class LineDisplay(SilentDisplay):
    """One line a stage, and one every two seconds of minimising."""

    def __init__(self, spec: StudySpec) -> None:
        self._progress, self._words = StudyProgress(spec), Words()
        self._last_line, self._last_stage = -LINE_INTERVAL, ""

    def take(self, event: AnyEvent) -> None:
        self._progress.take(event)
        self._words.take(event)
        if isinstance(event, Stage) and event.text != self._last_stage:
            self._last_stage = event.text
            self.say(event.text)
        elif isinstance(event, Warned):
            self.say(f"Warning: {event.text}")
        elif isinstance(event, Iteration) and time.monotonic() - self._last_line >= LINE_INTERVAL:
            self._last_line = time.monotonic()
            left = self._progress.seconds_left
            self.say(self._words.iteration(event) + (f", {time_left(left)}" if left is not None else ""))


class LiveDisplay:
    """A bar with the energy, the part done and the time left, redrawn ten times a second."""

    def __init__(self, spec: StudySpec) -> None:
        from rich.console import Console
        from rich.progress import BarColumn, Progress, SpinnerColumn, TaskProgressColumn, TextColumn, TimeElapsedColumn

        self._progress, self._words = StudyProgress(spec), Words()
        columns = [
            SpinnerColumn("line"),
            TextColumn("{task.description}"),
            BarColumn(24),
            TaskProgressColumn(),
            TimeElapsedColumn(),
            TextColumn("{task.fields[left]}"),
        ]
        self._bar = Progress(*columns, console=Console(stderr=True), transient=True, auto_refresh=False)
        self._task = self._bar.add_task("Preparing", total=None, left="")
        self._latest: Iteration | None = None

    def __enter__(self) -> LiveDisplay:
        self._bar.start()
        return self

    def __exit__(self, *details: object) -> None:
        self._bar.stop()

    def take(self, event: AnyEvent) -> None:
        self._progress.take(event)
        self._words.take(event)
        if isinstance(event, Iteration):
            self._latest = event
        elif isinstance(event, Stage):
            self._latest = None
            self._bar.update(self._task, description=event.text, total=None if event.fraction is None else 1.0, completed=event.fraction or 0.0)
        elif isinstance(event, Warned):
            self.say(f"Warning: {event.text}")

    def tick(self) -> None:
        if self._latest is not None:
            left = self._progress.seconds_left
            fields: dict[str, Any] = {"total": 1.0, "completed": self._progress.fraction, "left": "" if left is None else time_left(left)}
            self._bar.update(self._task, description=self._words.iteration(self._latest), **fields)
        self._bar.refresh()

    def say(self, text: str) -> None:
        self._bar.console.print(text, markup=False, highlight=False, soft_wrap=True)


class Words:
    """Puts an iterate into words; remembers of the run what the words need."""

    def __init__(self) -> None:
        self._started: Started | None = None

    def take(self, event: AnyEvent) -> None:
        if isinstance(event, Started):
            self._started = event

    def iteration(self, event: Iteration) -> str:
        started = self._started
        unit = started.energy_unit if started else "hartree"
        parts = [f"iteration {event.iteration:,}", f"energy {event.energy:.8f} {unit_name(unit)}"]
        if started and started.n_starts > 1:
            parts.insert(0, f"start {event.start + 1} of {started.n_starts}")
        if started and started.exact_energy is not None:
            factor, shown = difference_factor(unit, "mEh")
            parts.append(f"error {significant((event.energy - started.exact_energy) * factor)} {shown}")
        return ", ".join(parts)
