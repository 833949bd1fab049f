"""What a worker process can be asked to do. Each job is function(payload, emit, should_stop) -> plain data; no Qt here."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

from thalweg.study.events import AnyEvent, Stage, Warned
from thalweg.watch import Watch

Emit = Callable[[AnyEvent], None]
ShouldStop = Callable[[], bool]


def run(payload: Any, emit: Emit, should_stop: ShouldStop) -> None:
    """Runs the study whose settings are the payload; the result leaves as the event `Finished`."""
    from thalweg.study.run import run as run_study
    from thalweg.study.spec import spec_from_data

    run_study(spec_from_data(payload), emit, should_stop)


def inspect(payload: Any, emit: Emit, should_stop: ShouldStop) -> Any:
    """Figures of the study whose settings are the payload."""
    from thalweg.study.figures import inspect as inspect_study
    from thalweg.study.spec import spec_from_data

    watch = Watch(lambda text, fraction: emit(Stage(text=text, fraction=fraction)), should_stop, lambda text: emit(Warned(text=text)))
    return inspect_study(spec_from_data(payload), watch).model_dump(mode="json")


def draw(payload: Any, emit: Emit, should_stop: ShouldStop) -> str:
    """Draws a figure to a file; the payload holds the `figure` as data and the `path`, whose ending tells the format."""
    from thalweg_app.plots.printing import Figure, draw_figure

    path = Path(payload["path"])
    draw_figure(Figure.model_validate(payload["figure"]), path)
    return str(path)
