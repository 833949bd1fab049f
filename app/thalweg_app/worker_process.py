"""The process in which everything heavy runs. Started as `python -m thalweg_app.worker_process`; it imports no Qt.

It reads orders from standard input, one JSON object a line, answers on standard output, and ends when standard input closes.
"""

from __future__ import annotations

import contextlib
import faulthandler
import importlib
import os
import sys
import threading
import traceback
from collections.abc import Callable
from typing import Any, TextIO

from thalweg_app.compiled import announced, keep_compiled
from thalweg_app.threads import cap_threads

NICENESS = 10
#: Seconds without an order after which the process looks for something to prepare.
REST = 0.2


def protect_output() -> TextIO:
    """Keeps the real standard output for replies and sends what libraries print to standard error."""
    replies = os.fdopen(os.dup(1), "w", encoding="utf-8", newline="\n")
    os.dup2(2, 1)
    return replies


def be_modest() -> None:
    """Low priority and few threads, so that the window stays smooth."""
    cap_threads(spared=1)
    if hasattr(os, "nice"):
        with contextlib.suppress(OSError):
            os.nice(NICENESS)


class Desk:
    """Holds the one job that runs, and hears stop orders meanwhile."""

    def __init__(self, replies: TextIO) -> None:
        from thalweg_app.outbox import Outbox

        self.outbox = Outbox(replies)
        self._orders: list[Any] = []
        self._changed = threading.Condition()
        self._stopped: set[int] = set()
        self._noticed: set[int] = set()

    def listen(self, orders: TextIO) -> None:
        """Reads orders until the stream closes, then ends the process, whatever it is computing."""
        from thalweg_app.messages import ORDERS, StopJob

        for line in orders:
            order = ORDERS.validate_json(line)
            with self._changed:
                if isinstance(order, StopJob):
                    self._stopped.add(order.job)
                else:
                    self._orders.append(order)
                self._changed.notify()
        os._exit(0)

    def work(self, at_rest: Callable[[], None] | None = None) -> None:
        """Carries out orders for ever. `at_rest` is called once, when a job is done and no other has followed for a moment."""
        pause: float | None = None
        while True:
            with self._changed:
                has_order = self._changed.wait_for(lambda: bool(self._orders), pause)
                order = self._orders.pop(0) if has_order else None
            if order is not None:
                self._carry_out(order)
                pause = None if at_rest is None else REST
            elif at_rest is not None:
                at_rest()
                at_rest = pause = None

    def should_stop(self, job: int) -> bool:
        if job not in self._stopped:
            return False
        if job not in self._noticed:
            from thalweg_app.messages import Noticed

            self._noticed.add(job)
            self.outbox.message(Noticed(job=job))
        return True

    def tell_compiling(self, on: bool) -> None:
        from thalweg_app.messages import Compiling

        self.outbox.message(Compiling(on=on))

    def _carry_out(self, order: Any) -> None:
        from thalweg.errors import Stopped
        from thalweg_app.messages import Done, JobFailed, JobStopped

        job = order.job
        try:
            function = find(order.function)
            value = function(order.payload, lambda event: self.outbox.event(job, event), lambda: self.should_stop(job))
            self.outbox.message(Done(job=job, value=value))
        except Stopped:
            self.outbox.message(JobStopped(job=job))
        except BaseException as error:
            self.outbox.message(JobFailed(job=job, failure=failure_of(error)))


def find(dotted: str) -> Callable[..., Any]:
    """The function named `package.module:function`."""
    module, name = dotted.split(":")
    function: Callable[..., Any] = getattr(importlib.import_module(module), name)
    return function


def failure_of(error: BaseException) -> Any:
    """What went wrong, as an event: a StudyError's sentences, a lack of memory, or a defect with its traceback."""
    from thalweg.errors import StudyError
    from thalweg.study.events import Failed

    if isinstance(error, StudyError):
        return Failed(what=error.what, why=error.why, fix=error.fix, field=error.field)
    if isinstance(error, MemoryError):
        return Failed(
            what="Not enough memory",
            why="the computer refused the memory that this calculation needs",
            fix="Choose a smaller basis or active space, or close other programs",
        )
    details = "".join(traceback.format_exception(error))
    return Failed(what="The calculation ended by a defect of the program", why=f"{type(error).__name__}: {error}", details=details)


def warm_up() -> None:
    """Loads what the first job would otherwise wait for; a library that is missing is reported by the job that needs it."""
    for name in (
        "thalweg_app.jobs",
        "thalweg.study.run",
        "thalweg.study.figures",
        "scipy.optimize",
        "thalweg.systems.molecular",
        "thalweg.simulate.sector",
        "thalweg.exact.determinant",
        "scipy.sparse.linalg",
        "pyscf.scf.stability",
    ):
        with contextlib.suppress(ImportError):
            importlib.import_module(name)


def load_kernels() -> None:
    """Reads what a run needs where it is compiled; elsewhere the spare process compiles it now, and twice would take longer."""
    from thalweg_app.rehearsals import is_rehearsed, rehearse

    if is_rehearsed():
        rehearse()


def main() -> None:
    replies = protect_output()
    be_modest()
    keep_compiled()
    faulthandler.enable(sys.stderr)
    desk = Desk(replies)
    listener = threading.Thread(target=desk.listen, args=(sys.stdin,), name="orders", daemon=True)
    listener.start()
    cold = "--cold" in sys.argv
    if not cold:
        warm_up()
    with contextlib.nullcontext() if cold else announced(desk.tell_compiling):
        if "--rehearse" in sys.argv:
            from thalweg_app.rehearsals import rehearse

            rehearse()
        from thalweg_app.messages import Ready

        desk.outbox.message(Ready())
        desk.work(None if cold else load_kernels)


if __name__ == "__main__":
    main()
