"""How presenters have work done without knowing of processes: a starter, a job, and what it tells."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any, Protocol

from thalweg.study.events import AnyEvent, Failed

RUN = "thalweg_app.jobs:run"
INSPECT = "thalweg_app.jobs:inspect"
CHECK = "thalweg_app.jobs:check"
OPEN_FILE = "thalweg_app.jobs:open_file"
DRAW = "thalweg_app.jobs:draw"


def _ignore(*_: Any) -> None:
    return None


@dataclass(frozen=True)
class JobListener:
    """Called in the window's thread. Exactly one of `done`, `failed`, `stopped` comes, and it comes last."""

    events: Callable[[Sequence[AnyEvent]], None] = _ignore
    noticed: Callable[[], None] = _ignore
    done: Callable[[Any], None] = _ignore
    failed: Callable[[Failed], None] = _ignore
    stopped: Callable[[], None] = _ignore


class Job(Protocol):
    def stop(self) -> None:
        """Asks the job to end; within 200 ms it has noticed, or it is ended by force. Asked again, it is ended by force at once."""
        ...


class JobStarter(Protocol):
    def start(self, function: str, payload: Any, listener: JobListener) -> Job:
        """Runs the function named `module:function` as soon as a process is free."""
        ...
