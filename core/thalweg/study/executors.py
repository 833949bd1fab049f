"""Where the points of a scan and the starts of a study run: in this process, on this machine's cores, or on a Dask cluster."""

from __future__ import annotations

import contextlib
import multiprocessing
import os
import signal
import sys
import threading
from collections.abc import Callable, Iterator
from concurrent.futures import Executor, Future, ProcessPoolExecutor
from multiprocessing import forkserver, resource_tracker
from multiprocessing.connection import wait
from multiprocessing.context import BaseContext
from multiprocessing.process import BaseProcess
from typing import Any, TypeVar

from thalweg import __version__
from thalweg.errors import StudyError

T = TypeVar("T")
EXECUTORS = ("local", "serial", "dask")
_THREAD_LIMITS = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "NUMBA_NUM_THREADS")
#: Loaded once by the process that the workers are forked from.
_PRELOADED = ("thalweg.study.scan_task", "thalweg.study.rehearsal")
#: Seconds that the first pool of a process takes before its first point, for it loads the numerical libraries anew, and that later ones
#: take, which find them loaded (measured on two cores: 2.0 and 0.12, up to three times that on a busy machine).
START_UP, START_AGAIN = 2.5, 0.3
#: Seconds that a scheduler and its workers have to answer.
PATIENCE = 10


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


class Local(InProcess):
    """Begins in this process, and stays there while a pool would cost more than it saves."""

    def __init__(self, workers: int = 0) -> None:
        self.workers = workers or usable_cores()
        self._is_first, self._first, self._shortest = True, 0.0, float("inf")

    def took(self, seconds: float) -> None:
        """A point was run here. The first may have loaded libraries, which a pool would load as well: what is left of it counts."""
        if self._is_first:
            self._first, self._is_first = self._certain(seconds), False
        else:
            self._shortest = min(self._shortest, seconds)

    def pays(self, points_left: int, running: float = 0.0) -> bool:
        """Whether the time that a pool saves on these points is more than its start takes.

        `running`: seconds that a point under way has taken so far. While none but the first is done, each is expected to take as long as
        either at least.
        """
        workers = min(self.workers, points_left)
        start = START_AGAIN if _server_runs() else START_UP
        each = self._shortest if self._shortest < float("inf") else max(self._first, self._certain(running))
        return workers > 1 and each * points_left * (1.0 - 1.0 / workers) > start

    def _certain(self, seconds: float) -> float:
        return max(0.0, seconds - START_UP) if self._is_first else seconds

    def pool(self) -> Executor:
        return local_pool(self.workers)


def make_executor(kind: str, workers: int = 0, scheduler: str = "") -> Executor:
    """An executor for scan points. `workers` 0 takes all cores; `scheduler` is a Dask address such as `tcp://host:8786`."""
    if kind == "serial":
        return InProcess()
    if kind == "local":
        return Local(workers)
    if kind == "dask":
        return _dask(scheduler)
    raise StudyError(f"Unknown executor '{kind}'", "no such way to run points", "Use one of: " + ", ".join(EXECUTORS), "executor")


def usable_cores() -> int:
    """Cores that this process may run on (a batch system or a container may allow fewer than there are)."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def local_pool(workers: int = 0) -> ProcessPoolExecutor:
    """A pool of fresh processes, one thread each: with several threads they would fight for the cores.

    They are forked from a server that has the libraries loaded but no threads, where the system has such servers. This process itself is
    not forked: that would copy the threads of numba and Qt in an unknown state.
    """
    return _Pool(workers or usable_cores(), mp_context=worker_context(), initializer=_enter_worker)


def worker_context() -> BaseContext:
    """How processes are started here, and what they share with this one is made by."""
    context = multiprocessing.get_context("forkserver" if _has_server() else "spawn")
    if _has_server():
        context.set_forkserver_preload(list(_PRELOADED))
    return context


def start_process(function: Callable[..., None], *args: Any) -> BaseProcess:
    """function(*args) in a process like those of the pool. Waits for the server where that still loads its libraries.

    Only the server, once, or the process itself where there is none, takes over the surroundings that are arranged meanwhile.
    """
    process: BaseProcess = worker_context().Process(target=_as_worker, args=(function, args), daemon=True)  # type: ignore[attr-defined]
    if not _has_server():
        with _for_children():
            process.start()
        return process
    resource_tracker.ensure_running()  # the server would start it as well, and it lets Ctrl-C through again when it has
    with _for_children():
        forkserver.ensure_running()
    process.start()
    return process


def _as_worker(function: Callable[..., None], args: tuple[Any, ...]) -> None:
    _enter_worker()
    function(*args)


def _has_server() -> bool:
    """Linux only: elsewhere system libraries that are loaded do not survive a fork."""
    return sys.platform == "linux" and "forkserver" in multiprocessing.get_all_start_methods()


def _server_runs() -> bool:
    """Whether a pool of this process has loaded the libraries already."""
    return _has_server() and getattr(forkserver._forkserver, "_forkserver_pid", None) is not None


class _Pool(ProcessPoolExecutor):
    """Processes start inside `submit`, so that what they inherit is arranged there."""

    def submit(self, fn: Callable[..., T], /, *args: Any, **kwargs: Any) -> Future[T]:
        with _for_children():
            return super().submit(fn, *args, **kwargs)


_arranging = threading.Lock()


@contextlib.contextmanager
def _for_children() -> Iterator[None]:
    """One thread for every library, and deafness to Ctrl-C, which the terminal sends to all: the scan ends its workers itself."""
    with _arranging:
        before = {name: os.environ.get(name) for name in _THREAD_LIMITS}
        masked = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT}) if hasattr(signal, "pthread_sigmask") else None
        os.environ.update(dict.fromkeys(_THREAD_LIMITS, "1"))
        try:
            yield
        finally:
            for name, value in before.items():
                os.environ.pop(name) if value is None else os.environ.update({name: value})
            if masked is not None:
                signal.pthread_sigmask(signal.SIG_SETMASK, masked)


def _enter_worker() -> None:
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    parent = multiprocessing.parent_process()
    if parent is not None:
        threading.Thread(target=_leave_with, args=(parent.sentinel,), daemon=True).start()


def _leave_with(sentinel: int) -> None:
    """Ends this process when its parent has died, so that a killed program leaves no workers behind."""
    wait([sentinel])
    os._exit(1)


class _Cluster(Executor):
    """The workers of a Dask scheduler; shutting it down lets go of the connection, the cluster stays."""

    def __init__(self, client: Any) -> None:
        self._client = client
        self._executor: Executor = client.get_executor(pure=False)

    def submit(self, fn: Callable[..., T], /, *args: Any, **kwargs: Any) -> Future[T]:
        return self._executor.submit(fn, *args, **kwargs)

    def shutdown(self, wait: bool = True, *, cancel_futures: bool = False) -> None:
        self._executor.shutdown(wait=wait)
        self._client.close()


def _dask(scheduler: str) -> Executor:
    if not scheduler:
        raise StudyError("No Dask scheduler is named", "a cluster is reached by its address", "Give one such as tcp://host:8786", "scheduler")
    try:
        from distributed import Client
    except ImportError:
        raise StudyError("Dask is not installed", "it is optional", "Install it with: pip install 'thalweg[cluster]'", "executor") from None
    try:
        client = Client(scheduler, timeout=PATIENCE, set_as_default=False)
    except (OSError, ValueError) as error:
        raise StudyError(f"No Dask scheduler answers at {scheduler}", str(error)[:80] or "timed out", "Check the address", "scheduler") from None
    try:
        _check_workers(client, scheduler)
    except BaseException:
        client.close()
        raise
    return _Cluster(client)


def _check_workers(client: Any, scheduler: str) -> None:
    """StudyError where the cluster has no workers, or they have another version of this program or none."""
    try:
        client.wait_for_workers(1, timeout=PATIENCE)
    except (OSError, TimeoutError):
        raise StudyError(f"The cluster at {scheduler} has no workers", "nothing would ever run there", "Start a worker", "scheduler") from None
    fix = f"Install thalweg {__version__} on every worker"
    try:
        versions = set(client.run(own_version).values())
    except Exception as error:
        raise StudyError(f"The workers at {scheduler} cannot run scan points", f"{type(error).__name__}: {error}"[:120], fix, "scheduler") from None
    if versions != {__version__}:
        raise StudyError(f"The workers at {scheduler} run thalweg {', '.join(sorted(versions))}", f"here runs {__version__}", fix, "scheduler")


def own_version() -> str:
    """Asked of every worker of a cluster."""
    return __version__
