"""Where points of a scan run: pools that pay, clusters that do not answer, workers that are lost."""

import os
import signal
from concurrent.futures import Executor
from concurrent.futures.process import BrokenProcessPool
from pathlib import Path

import pytest
from support.scans import H2, energies, serial

from thalweg.errors import StudyError
from thalweg.study import executors
from thalweg.study.executors import InProcess, Local, local_pool, make_executor
from thalweg.study.scan import run_scan
from thalweg.study.scan_spec import ScanSpec, linear_points


def test_a_cluster_that_does_not_answer_is_refused_in_one_sentence(monkeypatch):
    monkeypatch.setattr(executors, "PATIENCE", 0.2)
    for scheduler, word in (
        ("", "No Dask scheduler is named"),
        ("tcp://127.0.0.1:9", "No Dask scheduler answers"),
        ("nonsense", "No Dask scheduler"),
    ):
        with pytest.raises(StudyError, match=word):
            make_executor("dask", scheduler=scheduler)


class Workers:
    """Stands for the client of a cluster."""

    def __init__(self, versions, arrive=True):
        self._versions, self._arrive = versions, arrive

    def wait_for_workers(self, count, timeout):
        if not self._arrive:
            raise TimeoutError

    def run(self, function):
        if isinstance(self._versions, Exception):
            raise self._versions
        return self._versions


@pytest.mark.parametrize(
    ("client", "word"),
    [
        (Workers({}, arrive=False), "has no workers"),
        (Workers({"a": "0.0.1"}), "run thalweg 0.0.1"),
        (Workers(ModuleNotFoundError("No module named 'thalweg'")), "cannot run scan points"),
    ],
)
def test_workers_that_cannot_run_points_are_refused_before_the_scan(client, word):
    with pytest.raises(StudyError, match=word):
        executors._check_workers(client, "tcp://host:1")


def test_a_pool_is_started_only_where_it_pays(monkeypatch):
    monkeypatch.setattr(executors, "_server_runs", lambda: False)
    local = Local(workers=4)
    assert not local.pays(1000)  # nothing is known yet
    local.took(executors.START_UP + 0.5)  # the first point loads libraries
    assert not local.pays(6)
    assert local.pays(10)
    local.took(0.01)
    assert not local.pays(100)
    assert local.pays(1000)
    assert not Local(workers=1).pays(10**6)
    warm = Local(workers=2)
    warm.took(0.01)  # as short as it may be, the first says nothing
    assert not warm.pays(10**6)
    warm.took(0.05)
    assert not warm.pays(40)
    monkeypatch.setattr(executors, "_server_runs", lambda: True)  # a second pool finds the libraries loaded
    assert warm.pays(40)


def test_what_a_point_under_way_has_taken_counts_until_a_better_figure_is_there(monkeypatch):
    monkeypatch.setattr(executors, "_server_runs", lambda: False)
    local = Local(workers=2)
    assert not local.pays(4, executors.START_UP + 1.0)  # much of it may be libraries
    assert local.pays(4, executors.START_UP + 2.0)
    local.took(executors.START_UP + 0.1)  # of which next to nothing is certain
    assert not local.pays(4, 1.0)
    assert local.pays(4, 2.0)
    local.took(0.5)
    assert not local.pays(4, 2.0)
    assert local.pays(11)


def test_a_long_scan_moves_to_a_pool_and_keeps_its_curve(monkeypatch):
    monkeypatch.setattr(executors, "START_UP", 0.0)
    monkeypatch.setattr(executors, "START_AGAIN", 0.0)
    scan = ScanSpec(study=H2, points=linear_points(0.6, 1.4, 6))
    made = []
    pool = Local.pool
    monkeypatch.setattr(Local, "pool", lambda self: made.append(pool(self)) or made[-1])
    assert energies(run_scan(scan, lambda: Local(workers=2))) == energies(serial(scan))
    assert made


def test_workers_are_deaf_to_ctrl_c_and_take_one_thread():
    with local_pool(1) as pool:
        handler, threads = pool.submit(surroundings).result()
    assert handler == signal.SIG_IGN
    assert threads == ["1"] * len(threads)


def surroundings():
    return signal.getsignal(signal.SIGINT), [os.environ.get(name, "") for name in executors._THREAD_LIMITS]


class Lossy(Executor):
    """A pool of one process, which ends itself instead of running `victim` while there is no marker of that."""

    def __init__(self, victim, folder):
        self._pool, self._victim, self._folder = local_pool(1), victim, folder

    def submit(self, fn, /, *args):
        if args[1] == self._victim:
            return self._pool.submit(end_process_once, str(self._folder), fn, *args)
        return self._pool.submit(fn, *args)

    def shutdown(self, wait=True, *, cancel_futures=False):
        self._pool.shutdown(wait=wait)


def end_process_once(folder, fn, *args):
    marker = Path(folder) / "ended"
    if not marker.exists():
        marker.touch()
        os._exit(9)
    return fn(*args)


def test_a_killed_worker_costs_one_retried_point(tmp_path):
    scan = ScanSpec(study=H2, points=linear_points(0.6, 1.0, 4))
    result = run_scan(scan, lambda: Lossy(scan.points[2], tmp_path))
    assert (tmp_path / "ended").exists()
    assert result.finished
    assert energies(result) == energies(serial(scan))


def test_a_worker_lost_twice_fails_its_point_alone_with_a_sentence():
    class Broken(InProcess):
        def submit(self, fn, /, *args, **kwargs):
            return super().submit(raise_broken if args[1] == 0.8 else fn, *args, **kwargs)

    result = run_scan(ScanSpec(study=H2, points=(0.7, 0.8, 0.9)), Broken)
    assert "ended twice" in result.points[1].failure
    assert [p.flags for p in result.points] == [(), ("failed",), ()]


def raise_broken(*_):
    raise BrokenProcessPool
