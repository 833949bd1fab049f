"""Runs a diagnosis by its settings."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Executor

from thalweg.study.diagnosis_result import LandscapeResult, TrainabilityResult
from thalweg.study.diagnosis_spec import AnyDiagnosis, Trainability
from thalweg.study.events import AnyEvent, watch_into
from thalweg.study.landscape import landscape
from thalweg.study.trainability import trainability


def diagnose(
    spec: AnyDiagnosis,
    executor: Executor | None = None,
    emit: Callable[[AnyEvent], None] = lambda event: None,
    should_stop: Callable[[], bool] = lambda: False,
) -> TrainabilityResult | LandscapeResult:
    """The record of the diagnosis; tasks run on the executor, or here where there is none. Raises StudyError and Stopped."""
    watch = watch_into(emit, should_stop)
    if isinstance(spec, Trainability):
        return trainability(spec, executor, watch)
    return landscape(spec, executor, watch)
