"""What the terminal shows while a scan runs: points as they come, the part done, and the time left. All of it on standard error."""

from __future__ import annotations

import sys
import time

from thalweg.study.events import AnyEvent, ScanPoint, ScanStarted, Stage, Warned
from thalweg_app.presenters.curve import CurveUnits
from thalweg_app.presenters.wording import difference_factor, significant, time_left
from thalweg_app.terminal.display import LINE_INTERVAL, Display, SilentDisplay
from thalweg_app.terminal.scan_answer import flag_lines, place


def make_scan_display(units: CurveUnits, known: int, *, quiet: bool) -> Display:
    """`known` points are taken over from a session."""
    if quiet:
        return SilentDisplay()
    return ScanBar(units, known) if sys.stderr.isatty() else ScanLines(units, known)


class Pace:
    """How far a scan is, and how long it may still take.

    Points that were known before cost nothing, and what came before the first new one (libraries, mean fields) does not come again.
    """

    def __init__(self, known: int) -> None:
        self._first_at, self._first_done = 0.0, 0
        self.done, self.total, self.unit = known, 0, ""

    def take(self, event: AnyEvent) -> None:
        if isinstance(event, ScanStarted):
            self.total, self.unit, self._first_done = len(event.points), event.unit, 0
        elif isinstance(event, ScanPoint):
            self.done = event.done
            if not self._first_done:
                self._first_at, self._first_done = time.monotonic(), event.done

    @property
    def seconds_left(self) -> float | None:
        """None before the second new point, and while points are looked at a second time."""
        new = self.done - self._first_done
        if not self._first_done or new < 1 or self.done >= self.total:
            return None
        return (time.monotonic() - self._first_at) * (self.total - self.done) / new

    @property
    def left_text(self) -> str:
        seconds = self.seconds_left
        return "" if seconds is None else time_left(seconds)


def point_text(event: ScanPoint, unit: str, units: CurveUnits) -> str:
    """`1.2 angstrom: energy -7.80 Eh, error 0.01 mEh`, or that the point failed."""
    where, result = place(event.point.coordinate, unit, units), event.point.result
    if result is None:
        return f"{where}: failed"
    scale, error_unit = difference_factor(result.energy_unit, units.difference)
    error = f", error {significant(result.error * scale)} {error_unit}" if result.error is not None else ""
    return f"{where}: energy {result.energy:.8f}{error}"


class ScanLines(SilentDisplay):
    """A line every two seconds, and one for whatever went wrong at a point."""

    def __init__(self, units: CurveUnits, known: int) -> None:
        self._units, self._pace = units, Pace(known)
        self._last_line, self._stage = -LINE_INTERVAL, ""

    def take(self, event: AnyEvent) -> None:
        self._pace.take(event)
        if isinstance(event, Stage) and event.text != self._stage:
            self._stage = event.text
            self.say(event.text)
        elif isinstance(event, Warned):
            self.say(f"Warning: {event.text}")
        elif isinstance(event, ScanPoint):
            self._tell(event)

    def _tell(self, event: ScanPoint) -> None:
        if event.point.failure:
            self.say(flag_lines(event.point, self._pace.unit, self._units)[0])
        if time.monotonic() - self._last_line >= LINE_INTERVAL:
            self._last_line = time.monotonic()
            left = self._pace.left_text
            progress = f"{event.done} of {event.total} points{', ' + left if left else ''}"
            self.say(f"{point_text(event, self._pace.unit, self._units)} ({progress})")


class ScanBar:
    """A bar with the latest point, the part done and the time left, redrawn some times a second."""

    def __init__(self, units: CurveUnits, known: int) -> None:
        from rich.console import Console
        from rich.progress import BarColumn, MofNCompleteColumn, Progress, SpinnerColumn, TextColumn, TimeElapsedColumn

        self._units, self._pace, self._text = units, Pace(known), "Preparing"
        columns = [
            SpinnerColumn("line"),
            TextColumn("{task.description}"),
            BarColumn(16),
            MofNCompleteColumn(),
            TimeElapsedColumn(),
            TextColumn("{task.fields[left]}"),
        ]
        self._bar = Progress(*columns, console=Console(stderr=True), transient=True, auto_refresh=False)
        self._task = self._bar.add_task("Preparing", total=None, left="")

    def __enter__(self) -> ScanBar:
        self._bar.start()
        return self

    def __exit__(self, *details: object) -> None:
        self._bar.stop()

    def take(self, event: AnyEvent) -> None:
        self._pace.take(event)
        if isinstance(event, ScanPoint):
            self._text = point_text(event, self._pace.unit, self._units)
            if event.point.failure:
                self.say(flag_lines(event.point, self._pace.unit, self._units)[0])
        elif isinstance(event, Stage):
            self._text = event.text
        elif isinstance(event, Warned):
            self.say(f"Warning: {event.text}")

    def tick(self) -> None:
        total = self._pace.total or None
        self._bar.update(self._task, description=self._text, total=total, completed=self._pace.done, left=self._pace.left_text)
        self._bar.refresh()

    def say(self, text: str) -> None:
        self._bar.console.print(text, markup=False, highlight=False, soft_wrap=True)
