"""Long loops done in parts."""

import threading

import pytest

from thalweg import parts
from thalweg.errors import Stopped
from thalweg.parts import allowed_threads, run_parts
from thalweg.watch import SILENT, Watch


@pytest.mark.parametrize("threads", [1, 2, 3])
@pytest.mark.parametrize(("count", "cost", "part"), [(1, 1, 1), (7, 2, 3), (10, 1, 100), (64, 2**20, 2**22), (65, 2**20, 2**24)])
def test_every_item_is_done_once_and_results_are_added(count, cost, part, threads):
    done = []

    def task(first, last, worker):
        assert 0 <= worker < threads
        done.extend(range(first, last))
        return float(last - first)

    assert run_parts(task, count, cost, part, SILENT, threads) == count
    assert sorted(done) == list(range(count))


def test_no_worker_number_is_used_by_two_calls_at_a_time(monkeypatch):
    monkeypatch.setattr(parts, "SHARED_FROM", 0)
    busy, seen, lock = set(), set(), threading.Lock()
    together = threading.Barrier(3, timeout=20)

    def task(first, last, worker):
        with lock:
            assert worker not in busy
            busy.add(worker)
        together.wait()  # passes only when three workers run at the same time
        seen.add((worker, threading.get_ident()))
        with lock:
            busy.remove(worker)
        return 0.0

    run_parts(task, 12, 1, 1, SILENT, 3)
    assert {worker for worker, _ in seen} == {0, 1, 2}


def test_small_work_stays_on_one_thread():
    idents = set()
    run_parts(lambda first, last, worker: idents.add(threading.get_ident()) or 0.0, 8, 1, 1, SILENT, 4)
    assert idents == {threading.get_ident()}


def test_a_stop_is_noticed_between_parts():
    asked = iter([False, False, True])
    done = []
    with pytest.raises(Stopped):
        run_parts(lambda first, last, worker: done.append(first) or 0.0, 10, 1, 1, Watch(should_stop=lambda: next(asked)))
    assert done == [0, 1]


@pytest.mark.parametrize(("text", "expected"), [("4", 4), ("0", 1), ("many", 1), (None, 1)])
def test_the_environment_bounds_the_threads(monkeypatch, text, expected):
    if text is None:
        monkeypatch.delenv("NUMBA_NUM_THREADS", raising=False)
    else:
        monkeypatch.setenv("NUMBA_NUM_THREADS", text)
    assert allowed_threads() == expected
