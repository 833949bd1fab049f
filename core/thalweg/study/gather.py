"""Independent tasks on any executor, with progress and stopping."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import FIRST_COMPLETED, Executor, wait
from typing import Any, TypeVar

from thalweg.study.executors import InProcess
from thalweg.watch import Watch

T = TypeVar("T")
#: How often it is asked whether to stop, seconds.
TICK = 0.05


def gather(function: Callable[..., T], tasks: Sequence[tuple[Any, ...]], executor: Executor | None, watch: Watch, text: str) -> list[T]:
    """function(*task) of every task, in the order of the tasks; without an executor one after another in this thread.

    Raises what a task raises, and Stopped when asked to stop; tasks that have not begun are then cancelled.
    """
    if executor is None or isinstance(executor, InProcess):
        found = []
        for number, task in enumerate(tasks):
            watch.stage(text, number / len(tasks))
            found.append(function(*task))
        return found
    futures = [executor.submit(function, *task) for task in tasks]
    try:
        waiting = set(futures)
        while waiting:
            watch.stage(text, 1 - len(waiting) / len(tasks))
            done, waiting = wait(waiting, timeout=TICK, return_when=FIRST_COMPLETED)
            for future in done:
                future.result()
    finally:
        for future in futures:
            future.cancel()
    return [future.result() for future in futures]
