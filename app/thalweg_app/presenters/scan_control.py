"""The scan being set up, the scan that runs, and the scans that were run."""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Literal

from pydantic import ValidationError

from thalweg.errors import StudyError
from thalweg.storage.session import ScanRun
from thalweg.study.events import AnyEvent, Failed, ScanFinished, ScanPoint, ScanStarted, Stage
from thalweg.study.path import PATHS, BondPath, FramesPath, ScanPath
from thalweg.study.path.setting import SettingPath
from thalweg.study.scan_refine import Place, refined
from thalweg.study.scan_result import CurvePoint, ScanResult
from thalweg.study.scan_spec import Literature, ScanSpec, geometric_points, linear_points, read_points
from thalweg.study.spec import StudySpec, study_error
from thalweg_app.presenters.curve import ShownCurve
from thalweg_app.presenters.jobs import Job, JobListener, JobStarter
from thalweg_app.presenters.listeners import Listeners
from thalweg_app.presenters.numbers import parse_number, parse_whole
from thalweg_app.presenters.scan_frames import FramesFile

SCAN = "thalweg_app.jobs:scan"
FORESEE = "thalweg_app.jobs:foresee"
#: How many points a refinement adds.
REFINED_BY = 4
#: More are a slip of the keyboard, and the list of them would halt the window.
MOST_POINTS = 10_000
REFINEMENTS: dict[Place, str] = {"minimum": "Around the minimum", "error": "Where the error is worst"}
Spacing = Literal["equal", "geometric", "list"]
SPACINGS: dict[Spacing, str] = {"equal": "Equal spacing", "geometric": "Geometric spacing", "list": "List of values"}


@dataclass
class ScanDraft:
    """What the form holds, as typed."""

    path: ScanPath = field(default_factory=BondPath)
    frames: FramesFile = field(default_factory=FramesFile)
    among_frames: str = ""  # numbers of the frames to run; empty for all
    spacing: Spacing = "equal"
    first: str = "0.6"
    last: str = "3.2"
    count: str = "24"
    values: str = ""
    both_directions: bool = False
    follow_orbitals: bool = True
    fixed_spin: bool = False
    literature: Literature = field(default_factory=Literature)

    def path_for(self, study: StudySpec) -> ScanPath:
        """The path; that over frames is read from their file. StudyError where they do not fit."""
        return self.frames.path(study) if isinstance(self.path, FramesPath) else self.path

    def points(self, path: ScanPath) -> tuple[float, ...]:
        """StudyError naming the field at fault."""
        if isinstance(path, FramesPath):
            return self._frame_numbers(path)
        if self.spacing == "list":
            return read_points(self.values)
        first, last = parse_number(self.first, "first"), parse_number(self.last, "last")
        make = linear_points if self.spacing == "equal" else geometric_points
        count = parse_whole(self.count, "count")
        if count > MOST_POINTS:
            raise StudyError(f"{count:,} points are too many", f"a scan has {MOST_POINTS:,} at the most", "Ask for fewer points", "count")
        return make(first, last, count)

    def _frame_numbers(self, path: FramesPath) -> tuple[float, ...]:
        if not self.among_frames.strip():
            return tuple(float(k + 1) for k in range(len(path.frames)))
        numbers = read_points(self.among_frames)
        for number in numbers:
            path.frame(number)
        return numbers


@dataclass
class LiveScan:
    """A scan under way: its points as they come."""

    spec: ScanSpec
    axis: str = ""
    unit: str = ""
    points: dict[int, CurvePoint] = field(default_factory=dict)
    total: int = 0
    stage: str = ""
    begun: float = field(default_factory=time.monotonic)
    result: ScanResult | None = None
    is_stopping: bool = False

    def take(self, events: Sequence[AnyEvent]) -> None:
        for event in events:
            if isinstance(event, ScanStarted):
                self.axis, self.unit, self.total = event.axis, event.unit, len(event.points)
            elif isinstance(event, ScanPoint):
                self.points[event.point.index] = event.point
                self.stage = f"Scanning: point {event.done} of {event.total}"
            elif isinstance(event, Stage):
                self.stage = event.text
            elif isinstance(event, ScanFinished):
                self.result = event.result

    @property
    def text(self) -> str:
        """What is done now."""
        return "Stopping, finished points are kept" if self.is_stopping else self.stage or "Waiting for a free process"

    @property
    def fraction(self) -> float | None:
        return len(self.points) / self.total if self.total else None

    @property
    def seconds_left(self) -> float | None:
        """From the time that the points so far have taken; None before the first."""
        if not self.points or not self.total:
            return None
        return (time.monotonic() - self.begun) * (self.total / len(self.points) - 1)


def scan_title(scan: ScanRun) -> str:
    """`Scan 2: LiH, STO-3G, Li1-H2 distance`, and how far it came when it is not complete."""
    r = scan.result
    state = "" if r.finished else f", {len([p for p in r.points if p.result])} of {len(r.spec.points)} points"
    return f"Scan {scan.number}: {r.label}, {r.axis}{state}"


class ScanControl:
    """`changed`: set-up, start, end or choice. `progressed`: the scan under way told something."""

    def __init__(self, starter: JobStarter, study: Callable[[], StudySpec | None], function: str = SCAN) -> None:
        self._starter, self._study, self._function = starter, study, function
        self._job: Job | None = None
        self.draft = ScanDraft()
        self.live: LiveScan | None = None
        self.scans: tuple[ScanRun, ...] = ()
        self._chosen: int | None = None
        self.seconds_ahead: float | None = None
        self.changed, self.progressed = Listeners(), Listeners()
        self.told = Listeners()  # (sentence)
        self.defect = Listeners()  # (Failed)

    @property
    def obstacle(self) -> str:
        """Why the scan cannot be started; empty when it can."""
        try:
            self.spec()
        except StudyError as error:
            return str(error)
        return ""

    @property
    def chosen(self) -> ScanRun | None:
        return next((s for s in self.scans if s.number == self._chosen), None)

    @property
    def shown(self) -> ShownCurve | None:
        """The scan under way, otherwise the chosen one."""
        if self.live is not None:
            points = tuple(self.live.points[i] for i in sorted(self.live.points))
            return ShownCurve("Variational", self.live.axis, self.live.unit, points)
        kept = self.chosen
        if kept is None:
            return None
        return ShownCurve("Variational", kept.result.axis, kept.result.unit, kept.result.points, kept.result)

    def spec(self) -> ScanSpec:
        """The scan as it is set up. StudyError when something does not fit."""
        study = self._study()
        if study is None:
            raise StudyError(
                "There is nothing to scan", "no system is open, or a setting is refused", "Open a system, or mend what is marked in the set-up"
            )
        draft = self.draft
        path = draft.path_for(study)
        scan = ScanSpec.model_validate(
            {
                "study": study,
                "path": path,
                "points": draft.points(path),
                "follow_orbitals": draft.follow_orbitals,
                "both_directions": draft.both_directions,
                "spin": "fixed" if draft.fixed_spin else "any",
                "literature": draft.literature,
            }
        )
        scan.at(scan.points[0])
        return scan

    def edit(self, name: str, value: Any) -> StudyError | None:
        """Sets a field of the draft, `path.FIELD` or `literature.FIELD` for one within; the error that it then has, if any."""
        part, _, last = name.partition(".")
        if not last:
            setattr(self.draft, name, value)
            self.changed()
            return None
        old = getattr(self.draft, part)
        data = old.model_dump() | {last: None if value == "" and part == "literature" and last != "source" else value}
        try:
            setattr(self.draft, part, type(old).model_validate(data))
        except ValidationError as error:
            return study_error(error)
        self.changed()
        return None

    def choose_path(self, key: str) -> None:
        cls = PATHS.get(key)
        if type(self.draft.path) is not cls:
            self.draft.path = cls()
            if cls is SettingPath and (study := self._study()) is not None:
                self.draft.path = SettingPath(setting=next(iter(numeric_settings(study)), ""))
            self.changed()

    def open_frames(self, file: Path) -> None:
        """Follows the frames of this file; a sentence when it cannot be read."""
        try:
            self.draft.frames = FramesFile.open(file)
        except StudyError as error:
            self.told(str(error))
            return
        self.draft.path = FramesPath()
        self.changed()

    @property
    def frames_told(self) -> str:
        """Which file of frames is followed, and how many frames it has."""
        return self.draft.frames.told(self._study())

    def pick_atom(self, number: int) -> None:
        """An atom was clicked in the picture: it becomes the second atom of the bond, and the second the first."""
        if isinstance(self.draft.path, BondPath) and number != self.draft.path.second:
            self.draft.path = BondPath(first=self.draft.path.second, second=number)
            self.changed()

    def start(self) -> None:
        """Runs the scan as set up; a sentence when it cannot be."""
        try:
            self._run(self.spec(), ())
        except StudyError as error:
            self.told(str(error))

    def resume(self) -> None:
        """Completes the chosen scan; finished points stay as they are."""
        kept = self.chosen
        if kept is not None and not kept.result.finished:
            self._run(kept.result.spec, tuple(p for p in kept.result.points if p.result is not None))

    def refine(self, where: Place) -> None:
        """Adds points to the chosen scan and runs only those; a sentence when there is nothing to refine."""
        kept = self.chosen
        if kept is None:
            return
        try:
            spec = refined(kept.result, REFINED_BY, where)
        except StudyError as error:
            self.told(str(error))
            return
        self._run(spec, tuple(p for p in kept.result.points if p.result is not None), checked=kept.result.finished)

    def foresee(self) -> None:
        """Asks how long the scan as set up will take; `seconds_ahead` holds the answer when it comes."""
        self.seconds_ahead = None
        try:
            spec = self.spec()
        except StudyError:
            return
        if self.live is None:
            listener = JobListener(done=lambda value: self._on_foreseen(spec, value))
            self._starter.start(FORESEE, {"scan": spec.model_dump(mode="json")}, listener)

    def _on_foreseen(self, spec: ScanSpec, seconds: float) -> None:
        if self.live is None and not self.obstacle and self.spec() == spec:
            self.seconds_ahead = seconds
            self.progressed()

    def stop(self) -> None:
        if self._job is not None and self.live is not None and not self.live.is_stopping:
            self.live.is_stopping = True
            self._job.stop()
            self.changed()

    def choose(self, number: int | None) -> None:
        if number != self._chosen:
            self._chosen = number
            self.changed()

    def load(self, scans: Sequence[ScanRun]) -> None:
        self.scans = tuple(scans)
        self._chosen = self.scans[-1].number if self.scans else None
        self.changed()

    def delete(self, number: int) -> None:
        self.scans = tuple(s for s in self.scans if s.number != number)
        self._chosen = self.scans[-1].number if self.scans else None
        self.changed()

    def _run(self, spec: ScanSpec, done: tuple[CurvePoint, ...], *, checked: bool = False) -> None:
        if self.live is not None:
            self.told("A scan is running; stop it or wait for its end.")
            return
        live = self.live = LiveScan(spec, spec.path.axis(spec.study), spec.path.unit(spec.study), placed(spec, done), len(spec.points))
        listener = JobListener(
            events=lambda events: self._on_events(live, events),
            done=lambda _: self._on_end(live),
            failed=lambda failure: self._on_failed(live, failure),
            stopped=lambda: self._on_end(live),
        )
        payload = {"scan": spec.model_dump(mode="json"), "done": [p.model_dump(mode="json") for p in done], "checked": checked}
        self._job = self._starter.start(self._function, payload, listener)
        self.changed()

    def _on_events(self, live: LiveScan, events: Sequence[AnyEvent]) -> None:
        live.take(events)
        self.progressed()

    def _on_end(self, live: LiveScan) -> None:
        result = live.result or self._cut_off(live)
        self.live, self._job = None, None
        if result is None:
            self.told("Stopped before there was any point to keep.")
        else:
            self._keep(result)
        self.changed()

    def _on_failed(self, live: LiveScan, failure: Failed) -> None:
        if failure.fix and not failure.details:
            self.told(str(StudyError(failure.what, failure.why, failure.fix, failure.field)))
        else:
            self.defect(failure)
        self._on_end(live)

    def _cut_off(self, live: LiveScan) -> ScanResult | None:
        """What a scan leaves whose process was ended by force: the points that had come."""
        from thalweg.study.scan_summary import summarise

        points = [live.points.get(i) or CurvePoint(index=i, coordinate=x, result=None) for i, x in enumerate(live.spec.points)]
        if not any(p.result is not None for p in points):
            return None
        return summarise(live.spec, points, time.monotonic() - live.begun)

    def _keep(self, result: ScanResult) -> None:
        """A scan that was completed or refined takes the place of what it went on from."""
        same = next((s for s in self.scans if _continues(result.spec, s.result)), None)
        number = same.number if same is not None else 1 + max((s.number for s in self.scans), default=0)
        kept = ScanRun(number=number, result=result)
        self.scans = (*(s for s in self.scans if s.number != number), kept)
        self._chosen = number


def placed(spec: ScanSpec, points: Sequence[CurvePoint]) -> dict[int, CurvePoint]:
    """Points of an earlier scan under their numbers in this one, which may hold more."""
    index = {x: i for i, x in enumerate(spec.points)}
    return {index[p.coordinate]: p.model_copy(update={"index": index[p.coordinate]}) for p in points if p.coordinate in index}


def _continues(spec: ScanSpec, earlier: ScanResult) -> bool:
    """Whether this scan has all points of the earlier one, and more, or completes it."""
    alike = spec.model_copy(update={"points": ()}) == earlier.spec.model_copy(update={"points": ()})
    more = set(spec.points) > set(earlier.spec.points)
    return alike and (more or (spec.points == earlier.spec.points and not earlier.finished))


def numeric_settings(study: StudySpec) -> list[str]:
    """Dotted names of the settings of the system that are plain numbers: couplings, fields, sites."""
    found: list[str] = []

    def walk(node: Any, prefix: str) -> None:
        for name in type(node).model_fields:
            value = getattr(node, name)
            if hasattr(type(value), "model_fields"):
                walk(value, f"{prefix}.{name}")
            elif isinstance(value, int | float) and not isinstance(value, bool):
                found.append(f"{prefix}.{name}")

    walk(study.system, "system")
    return found
