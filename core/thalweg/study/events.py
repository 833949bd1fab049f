"""The one stream of events that the window, the terminal and the tests consume. Every event is JSON."""

from __future__ import annotations

from collections.abc import Callable
from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field, TypeAdapter

from thalweg.study.result import GrowthStep, StudyResult
from thalweg.study.scan_result import CurvePoint, ScanResult
from thalweg.watch import Watch


class Event(BaseModel):
    model_config = ConfigDict(frozen=True, defer_build=True)


class Started(Event):
    """A run begins. Sent once the figures are known, before the first evaluation of each start."""

    kind: Literal["started"] = "started"
    label: str
    energy_unit: str
    reference_name: str
    reference_energy: float
    exact_energy: float | None
    target_error: float
    n_parameters: int
    n_starts: int


class Stage(Event):
    """What is being computed now; fraction done of the whole stage where it can be known."""

    kind: Literal["stage"] = "stage"
    text: str
    fraction: float | None = None


class Iteration(Event):
    """One iterate of one start; see `optimize.objective.Progress`.

    Starts that run side by side tell theirs in turn; iteration 0 of a start that was heard of before means that it begins anew.
    """

    kind: Literal["iteration"] = "iteration"
    start: int  # 0-based
    iteration: int
    evaluations: int
    energy: float
    gradient_norm: float | None
    seconds: float
    circuits: int = 0
    shots: int = 0
    standard_error: float | None = None
    noiseless: float | None = None


class StepTaken(Event):
    """A trial state has grown by one step, and its parameters have been searched again."""

    kind: Literal["growth-step"] = "growth-step"
    start: int  # 0-based
    number: int  # 0 for the reference or the shallowest circuit
    step: GrowthStep


class StartEnded(Event):
    """One start has come to its end; `energy` is that of its record."""

    kind: Literal["start-ended"] = "start-ended"
    start: int  # 0-based
    energy: float
    reason: str  # a key of STOP_REASONS
    seconds: float


class Warned(Event):
    kind: Literal["warned"] = "warned"
    text: str


class Finished(Event):
    kind: Literal["finished"] = "finished"
    result: StudyResult


class Failed(Event):
    """`what`, `why`, `fix` of a StudyError; for a defect `details` holds the traceback."""

    kind: Literal["failed"] = "failed"
    what: str
    why: str = ""
    fix: str = ""
    field: str = ""
    details: str = ""


class StoppedEarly(Event):
    """The person stopped before there was any best point to keep."""

    kind: Literal["stopped"] = "stopped"


class ScanStarted(Event):
    """A scan begins; the values of its points are in the unit of the coordinate."""

    kind: Literal["scan-started"] = "scan-started"
    axis: str
    unit: str
    points: tuple[float, ...]


class ScanPoint(Event):
    """A point is new, or a lower energy replaced its first one."""

    kind: Literal["scan-point"] = "scan-point"
    point: CurvePoint
    done: int
    total: int


class ScanFinished(Event):
    kind: Literal["scan-finished"] = "scan-finished"
    result: ScanResult


AnyEvent = Annotated[
    Started | Stage | Iteration | StepTaken | StartEnded | Warned | Finished | Failed | StoppedEarly | ScanStarted | ScanPoint | ScanFinished,
    Field(discriminator="kind"),
]
EVENT_ADAPTER: TypeAdapter[AnyEvent] = TypeAdapter(AnyEvent, config=ConfigDict(defer_build=True))


def watch_into(emit: Callable[[AnyEvent], None], should_stop: Callable[[], bool]) -> Watch:
    """A watch whose stages and warnings become events."""
    return Watch(lambda text, fraction: emit(Stage(text=text, fraction=fraction)), should_stop, lambda text: emit(Warned(text=text)))
