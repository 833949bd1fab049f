"""Where the points of a scan run: in this process, on this machine's cores, or on a Dask cluster."""

from __future__ import annotations

import multiprocessing
import os
import threading
from collections.abc import Callable
from concurrent.futures import Executor, Future, ProcessPoolExecutor
from multiprocessing.connection import wait
from typing import Any, TypeVar

from thalweg.errors import StudyError

T = TypeVar("T")
EXECUTORS = ("local", "serial", "dask")
_THREAD_LIMITS = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "NUMBA_NUM_THREADS")


class InProcess(Executor):
    """Runs each task at once, in the calling thread."""

    def submit(self, fn: Callable[..., T], /, *args: Any, **kwargs: Any) -> Future[T]:
        future: Future[T] = Future()
        try:
            future.set_result(fn(*args, **kwargs))
        except BaseException as error:  # the future carries it, as every executor does
            future.set_exception(error)
            if isinstance(error, KeyboardInterrupt):
                raise
        return future


def make_executor(kind: str, workers: int = 0, scheduler: str = "") -> Executor:
    """An executor for scan points. `workers` 0 takes all cores; `scheduler` is a Dask address such as `tcp://host:8786`."""
    if kind == "serial":
        return InProcess()
    if kind == "local":
        return local_pool(workers)
    if kind == "dask":
        return _dask(scheduler)
    raise StudyError(f"Unknown executor '{kind}'", "no such way to run points", "Use one of: " + ", ".join(EXECUTORS), "executor")


def local_pool(workers: int = 0) -> ProcessPoolExecutor:
    """A pool of fresh processes, one thread each: with several threads they would fight for the cores."""
    context = multiprocessing.get_context("spawn")  # fork would copy numba's and Qt's threads in an unknown state
    return ProcessPoolExecutor(workers or os.cpu_count() or 1, mp_context=context, initializer=_enter_worker)


def _enter_worker() -> None:
    for name in _THREAD_LIMITS:
        os.environ[name] = "1"
    parent = multiprocessing.parent_process()
    if parent is not None:
        threading.Thread(target=_leave_with, args=(parent.sentinel,), daemon=True).start()


def _leave_with(sentinel: int) -> None:
    """Ends this process when its parent has died, so that a killed program leaves no workers behind."""
    wait([sentinel])
    os._exit(1)


def _dask(scheduler: str) -> Executor:
    if not scheduler:
        raise StudyError("No Dask scheduler is named", "a cluster is reached by its address", "Give one such as tcp://host:8786", "scheduler")
    try:
        from distributed import Client
    except ImportError:
        raise StudyError("Dask is not installed", "it is optional", "Install it with: pip install 'thalweg[cluster]'", "executor") from None
    try:
        client = Client(scheduler, timeout="10s", set_as_default=False)
    except (OSError, ValueError) as error:
        raise StudyError(f"No Dask scheduler answers at {scheduler}", str(error)[:80] or "timed out", "Check the address", "scheduler") from None
    executor: Executor = client.get_executor(pure=False)
    return executor
