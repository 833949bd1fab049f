"""The one place with processes: a warm worker and a spare, each running one job at a time."""

from __future__ import annotations

import os
import sys
from collections import deque
from dataclasses import dataclass, field
from functools import partial
from pathlib import Path
from typing import Any

from PySide6.QtCore import QObject, QProcess, QProcessEnvironment, QTimer, Signal

import thalweg
import thalweg_app
from thalweg.study.events import Failed
from thalweg_app.messages import REPLIES, Compiling, Done, Events, JobFailed, JobStopped, Message, Noticed, Ready, StartJob, StopJob
from thalweg_app.presenters.jobs import JobListener

#: A job that has not noticed a stop after this many ms is ended by force.
PATIENCE_MS = 150
#: A job that has noticed gets this long to hand over its best point, unless it is stopped again.
GRACE_MS = 30_000
#: Processes that die one after the other before they are ready; then something is wrong with the installation.
MAX_FAILED_STARTS = 3
STDERR_KEPT = 8000


@dataclass(eq=False)
class PooledJob:
    """One piece of work, waiting or running."""

    number: int
    function: str
    payload: Any
    listener: JobListener
    pool: WorkerPool
    worker: Worker | None = None
    is_over: bool = False
    is_stopping: bool = False
    timer: QTimer = field(default_factory=QTimer)

    def stop(self) -> None:
        """Asks for an end; asked again, ends it by force."""
        if self.is_over:
            return
        if self.is_stopping:
            self.pool.force_job(self)
        else:
            self.is_stopping = True
            self.pool.stop_job(self)


class Worker(QObject):
    """One process. Signals carry the worker itself."""

    replied = Signal(object, object)
    ended = Signal(object)

    def __init__(self, arguments: list[str], parent: QObject) -> None:
        super().__init__(parent)
        self.is_ready = self.is_compiling = False
        self.job: PooledJob | None = None
        self.last_used = 0
        self._stderr = b""
        self.process = QProcess(self)
        self.process.setProcessEnvironment(_environment())
        self.process.readyReadStandardOutput.connect(self._read)
        self.process.readyReadStandardError.connect(self._read_stderr)
        self.process.finished.connect(lambda *_: self.ended.emit(self))
        self.process.errorOccurred.connect(self._on_error)
        self.process.start(sys.executable, ["-P", "-m", "thalweg_app.worker_process", *arguments])

    @property
    def is_idle(self) -> bool:
        return self.is_ready and self.job is None

    @property
    def stderr_tail(self) -> str:
        return self._stderr.decode("utf-8", errors="replace")

    def send(self, message: Message) -> None:
        self.process.write(message.model_dump_json().encode() + b"\n")

    def kill(self) -> None:
        self.process.kill()

    def _read(self) -> None:
        while self.process.canReadLine():
            line = bytes(self.process.readLine().data())
            self.replied.emit(self, REPLIES.validate_json(line))

    def _read_stderr(self) -> None:
        self._stderr = (self._stderr + bytes(self.process.readAllStandardError().data()))[-STDERR_KEPT:]

    def _on_error(self, error: QProcess.ProcessError) -> None:
        if error == QProcess.ProcessError.FailedToStart:
            self._stderr += self.process.errorString().encode()
            self.ended.emit(self)


class WorkerPool(QObject):
    """Gives each job to an idle process, the most recently used first because it holds the prepared system."""

    changed = Signal()

    def __init__(self, parent: QObject | None = None, *, size: int = 2, arguments: list[str] | None = None) -> None:
        super().__init__(parent)
        self._size, self._arguments = size, arguments or []
        self.workers: list[Worker] = []
        self._waiting: deque[PooledJob] = deque()
        self._next_job = 1
        self._failed_starts = 0
        self._broken: Failed | None = None
        self._closing = False
        self._hire()

    def start(self, function: str, payload: Any, listener: JobListener) -> PooledJob:
        job = PooledJob(self._next_job, function, payload, listener, self)
        self._next_job += 1
        self._waiting.append(job)
        QTimer.singleShot(0, self._assign)  # never call the listener from inside start
        return job

    def stop_job(self, job: PooledJob) -> None:
        if job.worker is None:
            self._waiting.remove(job)
            QTimer.singleShot(0, lambda: self._finish(job, job.listener.stopped))
            return
        job.worker.send(StopJob(job=job.number))
        job.timer.setSingleShot(True)
        job.timer.timeout.connect(lambda: self.force_job(job))
        job.timer.start(PATIENCE_MS)

    def shut_down(self) -> None:
        """Ends every process; nothing is told to listeners any more."""
        self._closing = True
        self._waiting.clear()
        for worker in self.workers:
            worker.process.closeWriteChannel()
        for worker in self.workers:
            if not worker.process.waitForFinished(100):
                worker.process.kill()
                worker.process.waitForFinished(1000)

    @property
    def is_compiling(self) -> bool:
        """Whether a process compiles kernels, which happens once for a version on a machine."""
        return any(worker.is_compiling for worker in self.workers)

    def _hire(self) -> None:
        """Starts one process; the next follows when it is ready, so that two do not warm up against each other."""
        spare = ["--rehearse"] if self.workers and "--cold" not in self._arguments else []
        worker = Worker([*self._arguments, *spare], self)
        worker.replied.connect(self._on_reply)
        worker.ended.connect(self._on_ended)
        self.workers.append(worker)

    def _assign(self) -> None:
        if self._broken is not None:
            while self._waiting:
                job = self._waiting.popleft()
                self._finish(job, partial(job.listener.failed, self._broken))
        idle = sorted((w for w in self.workers if w.is_idle), key=lambda w: w.last_used)
        while idle and self._waiting:
            worker, job = idle.pop(), self._waiting.popleft()
            worker.job, job.worker, worker.last_used = job, worker, job.number
            worker.send(StartJob(job=job.number, function=job.function, payload=job.payload))
        self.changed.emit()

    def _on_reply(self, worker: Worker, message: Message) -> None:
        if isinstance(message, Ready):
            worker.is_ready, self._failed_starts = True, 0
            if len(self.workers) < self._size:
                self._hire()
            self._assign()
            return
        if isinstance(message, Compiling):
            worker.is_compiling = message.on
            self.changed.emit()
            return
        job = worker.job
        if job is None or job.is_over or job.number != getattr(message, "job", None):
            return
        if isinstance(message, Events):
            job.listener.events(message.events)
        elif isinstance(message, Noticed):
            job.timer.start(GRACE_MS)
            job.listener.noticed()
        else:
            self._release(worker, job)
            self._finish(job, lambda: _tell_end(job.listener, message))
            self._assign()

    def _release(self, worker: Worker, job: PooledJob) -> None:
        worker.job = None
        job.worker = None

    def force_job(self, job: PooledJob) -> None:
        """Ends the process of a job that does not stop; the spare takes the next job."""
        worker = job.worker
        if worker is None or job.is_over:
            return
        self._release(worker, job)
        self._dismiss(worker)
        worker.kill()
        self._finish(job, job.listener.stopped)
        self._assign()

    def _dismiss(self, worker: Worker) -> None:
        if worker in self.workers:
            self.workers.remove(worker)
        worker.is_ready = False
        if not self._closing and self._broken is None and len(self.workers) < self._size:
            self._hire()

    def _on_ended(self, worker: Worker) -> None:
        if self._closing:
            return
        if worker in self.workers:
            self._failed_starts += 0 if worker.is_ready else 1
            if self._failed_starts >= MAX_FAILED_STARTS:
                self._broken = _cannot_start(worker)
            job = worker.job
            self._dismiss(worker)
            if job is not None:
                self._release(worker, job)
                told = job.listener.stopped if job.is_stopping else lambda: job.listener.failed(_was_ended(worker))
                self._finish(job, told)
        worker.deleteLater()
        self._assign()

    def _finish(self, job: PooledJob, tell: Any) -> None:
        if not job.is_over:
            job.is_over = True
            job.timer.stop()
            tell()


def _tell_end(listener: JobListener, message: Message) -> None:
    if isinstance(message, Done):
        listener.done(message.value)
    elif isinstance(message, JobFailed):
        listener.failed(message.failure)
    elif isinstance(message, JobStopped):
        listener.stopped()


def _was_ended(worker: Worker) -> Failed:
    crashed = worker.process.exitStatus() == QProcess.ExitStatus.CrashExit
    how = f"by signal {worker.process.exitCode()}" if crashed else f"with status {worker.process.exitCode()}"
    return Failed(
        what="The calculation was cut off",
        why=f"its process was ended from outside {how}, most often because the computer ran out of memory",
        fix="Run it again, with a smaller basis or active space if it happens twice",
        details=worker.stderr_tail,
    )


def _cannot_start(worker: Worker) -> Failed:
    return Failed(
        what="Nothing can be calculated",
        why="the process that calculates does not start",
        fix="Install the program again; the details say what is missing",
        details=worker.stderr_tail,
    )


def _environment() -> QProcessEnvironment:
    """The window's environment, with the packages found where the window found them."""
    environment = QProcessEnvironment.systemEnvironment()
    roots = [str(Path(str(package.__file__)).resolve().parents[1]) for package in (thalweg, thalweg_app)]
    inherited = environment.value("PYTHONPATH")
    environment.insert("PYTHONPATH", os.pathsep.join(dict.fromkeys([*roots, *([inherited] if inherited else [])])))
    environment.insert("PYTHONIOENCODING", "utf-8")
    return environment
