"""What the terminal shows while a study runs: a live line on a screen, plain lines in a pipe. Everything goes to standard error."""

from __future__ import annotations

import sys
import time
from typing import Protocol

from thalweg.study.events import AnyEvent, Iteration, Stage, StartEnded, Warned
from thalweg.study.result import STOP_REASONS
from thalweg.study.spec import StudySpec
from thalweg_app.presenters.live import LiveRun
from thalweg_app.presenters.progress import estimate, starts_in_words
from thalweg_app.presenters.wording import difference_factor, significant, time_left, unit_name

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
    """One line a stage, one a start that has ended where there are several, and one every two seconds of minimising."""

    def __init__(self, spec: StudySpec) -> None:
        self._live = LiveRun(spec)
        self._last_line = -LINE_INTERVAL

    def take(self, event: AnyEvent) -> None:
        before = self._live.stage
        self._live.take([event])
        if isinstance(event, Stage) and event.text != before:
            self.say(event.text[:1].upper() + event.text[1:])
        elif isinstance(event, Warned):
            self.say(f"Warning: {event.text}")
        elif isinstance(event, StartEnded):
            self._tell_end(event)
        elif isinstance(event, Iteration) and time.monotonic() - self._last_line >= LINE_INTERVAL:
            self._last_line = time.monotonic()
            left = estimate(self._live).seconds_left
            self.say(iterate_text(self._live, event) + (f", {time_left(left)}" if left is not None else ""))

    def _tell_end(self, event: StartEnded) -> None:
        started = self._live.started
        if started is not None and started.n_starts > 1:
            reason = STOP_REASONS.get(event.reason, event.reason)
            unit = unit_name(started.energy_unit)
            self.say(f"Start {event.start + 1} ended at {event.energy:.8f} {unit}: {reason}; {self._live.ended} of {started.n_starts} done")


class LiveDisplay:
    """A bar with the energy, the part done and the time left, redrawn ten times a second."""

    def __init__(self, spec: StudySpec) -> None:
        from rich.console import Console
        from rich.progress import BarColumn, Progress, SpinnerColumn, TaskProgressColumn, TextColumn, TimeElapsedColumn

        self._live = LiveRun(spec)
        self._latest: dict[int, Iteration] = {}  # of each start
        columns = [
            SpinnerColumn("line"),
            TextColumn("{task.description}"),
            BarColumn(16),
            TaskProgressColumn(),
            TimeElapsedColumn(),
            TextColumn("{task.fields[left]}"),
        ]
        self._bar = Progress(*columns, console=Console(stderr=True), transient=True, auto_refresh=False)
        self._task = self._bar.add_task("Preparing", total=None, left="")

    def __enter__(self) -> LiveDisplay:
        self._bar.start()
        return self

    def __exit__(self, *details: object) -> None:
        self._bar.stop()

    def take(self, event: AnyEvent) -> None:
        self._live.take([event])
        if isinstance(event, Iteration):
            self._latest[event.start] = event
        elif isinstance(event, Stage) and len(self._live.running) < 2:  # side by side it is one of many
            self._latest.clear()
        elif isinstance(event, Warned):
            self.say(f"Warning: {event.text}")

    def tick(self) -> None:
        now = estimate(self._live)
        latest = None if self._live.lead is None else self._latest.get(self._live.lead)
        text = now.text if latest is None else iterate_text(self._live, latest)
        self._bar.tasks[0].total = None if now.fraction is None else 1.0  # the library's `update` cannot take a total back
        left = "" if now.seconds_left is None else time_left(now.seconds_left)
        self._bar.update(self._task, description=text, completed=now.fraction or 0.0, left=left)
        self._bar.refresh()

    def say(self, text: str) -> None:
        self._bar.console.print(text, markup=False, highlight=False, soft_wrap=True)


def iterate_text(live: LiveRun, event: Iteration) -> str:
    """An iterate in words, with its error where the exact energy is known."""
    started = live.started
    if started is None:
        return f"iteration {event.iteration:,}"
    parts = [f"iteration {event.iteration:,}", f"energy {event.energy:.8f} {unit_name(started.energy_unit)}"]
    if which := starts_in_words(live, event.start):
        parts.insert(0, which)
    if started.exact_energy is not None:
        factor, unit = difference_factor(started.energy_unit, "mEh")
        parts.append(f"error {significant((event.energy - started.exact_energy) * factor)} {unit}")
    return ", ".join(parts)
