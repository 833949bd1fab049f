"""Processes that run starts of one study beside this one, each joined to it by a pipe of its own.

No executor: its processes share queues, so that one that is killed while it holds a lock silences the others, and it gives all of them
up when one is lost. A start may run for hours, and is to be lost with its own process only.
"""

from __future__ import annotations

import os
import pickle
import threading
import time
import traceback
from collections.abc import Callable
from dataclasses import dataclass, replace
from multiprocessing.connection import Connection, Pipe, wait
from multiprocessing.process import BaseProcess
from typing import Any

from thalweg.errors import Stopped
from thalweg.exact.answer import ExactAnswer
from thalweg.parts import allowed_threads
from thalweg.study.events import AnyEvent, Iteration
from thalweg.study.executors import start_process, worker_context
from thalweg.study.outcome import PlainEnd, without_study
from thalweg.study.problem import Problem
from thalweg.study.search import run_start

#: Seconds between two messages of a process with iterates.
PAUSE = 1.0 / 30.0
#: Seconds that the system has to clear a process away that was ended by force.
PATIENCE = 1.0


@dataclass(frozen=True)
class Ready:
    """A process has what it needs for its first start."""


@dataclass(frozen=True)
class Told:
    """Events of the start under way, in order."""

    events: tuple[AnyEvent, ...]


@dataclass(frozen=True)
class Ended:
    """The start under way is over; None where it was stopped before its first energy."""

    end: PlainEnd | None


@dataclass(frozen=True)
class Raised:
    """The start under way raised an error."""

    error: BaseException


@dataclass(frozen=True)
class Lost:
    """The process is no more. Said of it, never by it."""


News = Ready | Told | Ended | Raised | Lost


@dataclass(eq=False)
class StartWorker:
    """One of the processes; `index` is the start that it runs, None for none."""

    process: BaseProcess
    pipe: Connection
    index: int | None = None

    def give(self, index: int) -> None:
        """Orders a start. A process that is lost says so by its next news."""
        self.index = index
        try:
            self.pipe.send(index)
        except OSError:
            return

    def end(self) -> None:
        if self.process.is_alive():
            self.process.kill()
            self.process.join(PATIENCE)
        self.pipe.close()


class StartWorkers:
    """`count` processes for this study. They are started in a thread, as the first waits for a server to load its libraries."""

    def __init__(self, problem: Problem, exact: ExactAnswer | None, count: int) -> None:
        self._flag: Any = worker_context().RawValue("b", 0)  # no lock: a killed process would keep it
        self._study = pickle.dumps((plain_problem(problem), None if exact is None else replace(exact, vectors=None)))
        self._workers: list[StartWorker] = []
        self._lock, self._is_closed, self._is_launching = threading.Lock(), False, True
        threading.Thread(target=self._launch, args=(count,), name="starts", daemon=True).start()

    @property
    def is_alive(self) -> bool:
        """Whether there are processes, or some to come."""
        return self._is_launching or bool(self._workers)

    @property
    def running(self) -> list[int]:
        """The starts under way."""
        return [w.index for w in self._workers if w.index is not None]

    def news(self, seconds: float) -> list[tuple[StartWorker, News]]:
        """What the processes have told; waits up to `seconds` for a first word."""
        with self._lock:
            by_pipe = {worker.pipe: worker for worker in self._workers}
        if not by_pipe:
            time.sleep(seconds)
        found = []
        for pipe in wait(list(by_pipe), seconds):
            worker = by_pipe[pipe]  # type: ignore[index]
            try:
                found.append((worker, worker.pipe.recv()))
            except (EOFError, OSError):
                self.dismiss(worker)
                found.append((worker, Lost()))
        return found

    def stop(self) -> None:
        """Asks every start under way for its best, and ends the processes that run none."""
        self._flag.value = 1
        for worker in [w for w in self._workers if w.index is None]:
            self.dismiss(worker)

    def close(self) -> None:
        """Ends every process."""
        with self._lock:
            self._is_closed = True
        for worker in list(self._workers):
            self.dismiss(worker)

    def dismiss(self, worker: StartWorker) -> None:
        """Ends this process."""
        with self._lock:
            self._workers = [w for w in self._workers if w is not worker]
        worker.end()

    def _launch(self, count: int) -> None:
        try:
            for _ in range(count):
                if self._is_closed:
                    return
                self._start_one()
        except OSError:  # no process can be had: the starts run where they are
            return
        finally:
            self._is_launching = False

    def _start_one(self) -> None:
        ours, theirs = Pipe()
        with theirs:
            worker = StartWorker(start_process(serve, theirs, self._flag, self._study, allowed_threads()), ours)
        with self._lock:
            self._workers += [] if self._is_closed else [worker]
        if self._is_closed:
            worker.end()


def plain_problem(problem: Problem) -> Problem:
    """What a start stands on, as data for another process: the numbers themselves, since a second mean field may differ by signs."""
    return replace(problem, prepared=replace(problem.prepared, mean_field=None, seed=None))


def serve(pipe: Connection, flag: Any, study: bytes, threads: int) -> None:
    """The life of such a process. Long loops are cut for as many threads as in the first process, as their sums depend on the cut."""
    os.environ["NUMBA_NUM_THREADS"] = str(threads)
    problem, exact = pickle.loads(study)
    pipe.send(Ready())
    while True:
        try:
            index = pipe.recv()
        except EOFError:
            return
        teller = _Teller(pipe)
        answer = _answer(problem, exact, index, teller.take, lambda: bool(flag.value))
        teller.flush()
        pipe.send(answer)


class _Teller:
    """Gathers iterates, so that fast starts do not write a message for each; whatever else is told leaves at once."""

    def __init__(self, pipe: Connection) -> None:
        self._pipe, self._waiting, self._sent = pipe, list[AnyEvent](), 0.0

    def take(self, event: AnyEvent) -> None:
        self._waiting.append(event)
        if not isinstance(event, Iteration) or time.perf_counter() - self._sent > PAUSE:
            self.flush()

    def flush(self) -> None:
        if self._waiting:
            self._pipe.send(Told(tuple(self._waiting)))
            self._waiting.clear()
            self._sent = time.perf_counter()


def _answer(
    problem: Problem, exact: ExactAnswer | None, index: int, emit: Callable[[AnyEvent], None], should_stop: Callable[[], bool]
) -> Ended | Raised:
    try:
        return Ended(without_study(*run_start(problem, exact, index, None, emit, should_stop), problem))
    except Stopped:
        return Ended(None)
    except BaseException as error:
        return Raised(_portable(error))


def _portable(error: BaseException) -> BaseException:
    """The error with the traceback in words, which does not travel by itself."""
    details = "".join(traceback.format_exception(error))
    try:
        pickle.loads(pickle.dumps(error))
    except Exception:
        return RuntimeError(details)
    error.add_note(details)
    return error
