"""What a worker process can be asked to do. Each job is function(payload, emit, should_stop) -> plain data; no Qt here."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

from thalweg.study.events import AnyEvent, watch_into

Emit = Callable[[AnyEvent], None]
ShouldStop = Callable[[], bool]


def run(payload: Any, emit: Emit, should_stop: ShouldStop) -> None:
    """Runs the study whose settings are the payload, several starts side by side where that pays; the result leaves as the event `Finished`."""
    from thalweg.study.executors import Local
    from thalweg.study.run import run as run_study
    from thalweg.study.spec import spec_from_data

    run_study(spec_from_data(payload), emit, should_stop, Local())


def check(payload: Any, emit: Emit, should_stop: ShouldStop) -> Any:
    """Repeats the run whose result is the payload and gives the deviation; None when stopped on the way."""
    from thalweg.study.executors import Local
    from thalweg.study.repeat import repeat
    from thalweg.study.result import StudyResult

    repetition = repeat(StudyResult.model_validate(payload), emit, should_stop, Local())
    return None if repetition is None else repetition.model_dump(mode="json", exclude={"result"})


def inspect(payload: Any, emit: Emit, should_stop: ShouldStop) -> Any:
    """Figures of the study whose settings are the payload."""
    from thalweg.study.figures import inspect as inspect_study
    from thalweg.study.spec import spec_from_data

    watch = watch_into(emit, should_stop)
    return inspect_study(spec_from_data(payload), watch).model_dump(mode="json")


def open_file(payload: Any, emit: Emit, should_stop: ShouldStop) -> Any:
    """Reads the payload's `path` (coordinates in `unit`): {"session": ...}, or {"system": ..., "notes": [...]}."""
    from thalweg.storage.open_file import open_as_data

    return open_as_data(Path(payload["path"]), payload["unit"])


def draw(payload: Any, emit: Emit, should_stop: ShouldStop) -> str:
    """Draws the payload's `chart` to its `path`, whose ending tells the format: png, svg or pdf."""
    from thalweg_app.plots.printing import draw_chart
    from thalweg_app.presenters.chart import chart_from_data

    path = Path(payload["path"])
    draw_chart(chart_from_data(payload["chart"]), path)
    return str(path)


def scan(payload: Any, emit: Emit, should_stop: ShouldStop) -> None:
    """Runs the payload's `scan` but for the points in `done`; points leave as events, the curve as `ScanFinished`.

    `checked` tells that the points in `done` have been compared with their neighbours already.
    """
    from thalweg.study.executors import make_executor
    from thalweg.study.scan import run_scan
    from thalweg.study.scan_result import CurvePoint
    from thalweg.study.scan_spec import ScanSpec

    spec = ScanSpec.model_validate(payload["scan"])
    done = [CurvePoint.model_validate(point) for point in payload["done"]]
    run_scan(spec, lambda: make_executor("local"), emit, should_stop, done=done, checked=payload["checked"])


def foresee(payload: Any, emit: Emit, should_stop: ShouldStop) -> float:
    """Seconds that the payload's `scan` will take, estimated."""
    from thalweg.study.scan_foresight import foresee as seconds_of
    from thalweg.study.scan_spec import ScanSpec

    return seconds_of(ScanSpec.model_validate(payload["scan"]), watch=watch_into(emit, should_stop))


def diagnose(payload: Any, emit: Emit, should_stop: ShouldStop) -> Any:
    """What the payload's `what` asks: `settings` for trainability and landscape, `result` of a run for curvature and starts."""
    from pydantic import TypeAdapter

    from thalweg.study.diagnosis import diagnose as run_diagnosis
    from thalweg.study.diagnosis_spec import AnyDiagnosis
    from thalweg.study.executors import InProcess
    from thalweg.study.hessian import curvature_of, spread_of_starts
    from thalweg.study.result import StudyResult

    if payload["what"] == "starts":
        return spread_of_starts(StudyResult.model_validate(payload["result"])).model_dump(mode="json")
    if payload["what"] == "curvature":
        return curvature_of(StudyResult.model_validate(payload["result"]), watch_into(emit, should_stop)).model_dump(mode="json")
    settings: Any = TypeAdapter(AnyDiagnosis).validate_python(payload["settings"])
    return run_diagnosis(settings, InProcess(), emit, should_stop).model_dump(mode="json")
