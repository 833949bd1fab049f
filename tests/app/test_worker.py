import io
import os
import threading
import time

import pytest

from thalweg.study.events import Iteration, Stage
from thalweg_app import worker_process
from thalweg_app.messages import Compiling
from thalweg_app.presenters.jobs import JobListener
from thalweg_app.worker import MAX_FAILED_STARTS, WorkerPool

#: Milliseconds that a loaded machine may take to start a process; nothing is timed by it.
PATIENCE = 60_000


class Heard:
    """Keeps what a job told."""

    def __init__(self):
        self.lines, self.events, self.ends, self.ended_at = 0, [], [], 0.0
        self.listener = JobListener(
            events=self._events,
            noticed=lambda: self.ends.append(("noticed", None)),
            done=lambda value: self._end("done", value),
            failed=lambda failure: self._end("failed", failure),
            stopped=lambda: self._end("stopped", None),
        )

    def _events(self, events):
        self.lines += 1
        self.events.extend(events)

    def _end(self, kind, value):
        self.ended_at = time.perf_counter()
        self.ends.append((kind, value))

    @property
    def is_over(self):
        return bool(self.ends) and self.ends[-1][0] != "noticed"


@pytest.fixture
def pool(qtbot):
    pool = WorkerPool(arguments=["--cold"])
    yield pool
    pool.shut_down()


def play(qtbot, pool, name, payload=None):
    heard = Heard()
    pool.start(f"fake_jobs:{name}", payload, heard.listener)
    qtbot.waitUntil(lambda: heard.is_over, timeout=PATIENCE)
    return heard


def both_ready(qtbot, pool):
    qtbot.waitUntil(lambda: len(pool.workers) == 2 and all(w.is_ready for w in pool.workers), timeout=PATIENCE)


def test_a_job_gets_its_payload_and_gives_its_value(qtbot, pool):
    assert play(qtbot, pool, "echo", {"basis": "sto-3g", "n": [1, 2.5, None]}).ends == [("done", {"basis": "sto-3g", "n": [1, 2.5, None]})]


def test_events_arrive_complete_in_order_and_gathered(qtbot, pool):
    heard = play(qtbot, pool, "chatter", 5000)
    assert [e.iteration for e in heard.events if isinstance(e, Iteration)] == list(range(5000))
    assert isinstance(heard.events[-1], Stage)
    assert heard.lines < 500
    assert heard.ends == [("done", "end")]


def test_what_libraries_print_does_not_disturb_the_replies(qtbot, pool):
    assert play(qtbot, pool, "print_noise").ends == [("done", "clean")]


def test_a_job_that_listens_keeps_its_best_when_stopped(qtbot, pool):
    heard = Heard()
    job = pool.start("fake_jobs:polite", None, heard.listener)
    qtbot.waitUntil(lambda: job.worker is not None, timeout=PATIENCE)
    qtbot.wait(50)
    job.stop()
    qtbot.waitUntil(lambda: heard.is_over, timeout=PATIENCE)
    assert heard.ends == [("noticed", None), ("done", "best so far")]


def test_a_job_stopped_before_it_has_a_best_point_says_so(qtbot, pool):
    heard = Heard()
    job = pool.start("fake_jobs:stopped_early", None, heard.listener)
    qtbot.waitUntil(lambda: job.worker is not None, timeout=PATIENCE)
    job.stop()
    qtbot.waitUntil(lambda: heard.is_over, timeout=PATIENCE)
    assert heard.ends[-1] == ("stopped", None)


def test_a_deaf_job_is_ended_by_force_and_the_spare_takes_over(qtbot, pool):
    both_ready(qtbot, pool)
    heard = Heard()
    job = pool.start("fake_jobs:deaf", None, heard.listener)
    qtbot.waitUntil(lambda: bool(heard.events), timeout=PATIENCE)
    spare = next(w for w in pool.workers if w.job is None)
    asked = time.perf_counter()
    job.stop()
    qtbot.waitUntil(lambda: heard.is_over, timeout=PATIENCE)
    assert heard.ends == [("stopped", None)]
    assert heard.ended_at - asked < 30.0  # by force: left to itself the job sleeps for a minute
    after = play(qtbot, pool, "process_id")
    assert after.ends == [("done", spare.process.processId())]
    both_ready(qtbot, pool)


def test_a_job_that_takes_long_to_hand_over_is_ended_when_stopped_again(qtbot, pool):
    heard = Heard()
    job = pool.start("fake_jobs:slow_to_hand_over", None, heard.listener)
    qtbot.waitUntil(lambda: job.worker is not None, timeout=PATIENCE)
    qtbot.wait(50)
    job.stop()
    qtbot.waitUntil(lambda: bool(heard.ends), timeout=PATIENCE)
    assert heard.ends == [("noticed", None)]
    job.stop()
    assert heard.ends == [("noticed", None), ("stopped", None)]


def test_a_job_still_waiting_can_be_stopped(qtbot, pool):
    heard = Heard()
    job = pool.start("fake_jobs:echo", 1, heard.listener)
    job.stop()
    qtbot.waitUntil(lambda: heard.is_over, timeout=PATIENCE)
    assert heard.ends == [("stopped", None)]


def test_a_killed_process_is_told_in_a_sentence_and_work_goes_on(qtbot, pool):
    heard = play(qtbot, pool, "killed")
    kind, failure = heard.ends[0]
    assert kind == "failed"
    assert "cut off" in failure.what
    assert "signal 9" in failure.why
    assert play(qtbot, pool, "echo", 7).ends == [("done", 7)]


def test_lack_of_memory_is_told_in_a_sentence_and_work_goes_on(qtbot, pool):
    kind, failure = play(qtbot, pool, "out_of_memory").ends[0]
    assert (kind, failure.what, failure.details) == ("failed", "Not enough memory", "")
    assert play(qtbot, pool, "echo", 7).ends == [("done", 7)]


def test_bad_input_keeps_its_sentences_and_its_field(qtbot, pool):
    kind, failure = play(qtbot, pool, "wrong_input").ends[0]
    assert kind == "failed"
    assert (failure.what, failure.why, failure.fix, failure.field) == ("Too many electrons", "only 2 fit", "Take fewer", "system.charge")


def test_a_defect_carries_its_traceback(qtbot, pool):
    _, failure = play(qtbot, pool, "defect").ends[0]
    assert "ZeroDivisionError" in failure.details
    assert "fake_jobs.py" in failure.details


def test_two_jobs_run_at_once_and_the_third_waits(qtbot, pool):
    both_ready(qtbot, pool)
    long = [Heard(), Heard()]
    jobs = [pool.start("fake_jobs:polite", None, h.listener) for h in long]
    qtbot.waitUntil(lambda: all(j.worker is not None for j in jobs), timeout=PATIENCE)
    third = Heard()
    pool.start("fake_jobs:echo", 3, third.listener)
    qtbot.wait(100)
    assert not third.ends
    jobs[0].stop()
    qtbot.waitUntil(lambda: third.is_over, timeout=PATIENCE)
    jobs[1].stop()
    qtbot.waitUntil(lambda: long[1].is_over, timeout=PATIENCE)


def test_worker_processes_end_with_the_pool(qtbot):
    pool = WorkerPool(arguments=["--cold"])
    heard = play(qtbot, pool, "process_id")
    number = heard.ends[0][1]
    pool.shut_down()
    with pytest.raises(ProcessLookupError):
        os.kill(number, 0)


def test_a_worker_that_never_starts_is_told_with_what_it_printed(qtbot, monkeypatch):
    monkeypatch.setattr("sys.executable", "/nowhere/python")
    pool = WorkerPool()
    heard = play(qtbot, pool, "echo", 1)
    assert heard.ends[0][0] == "failed"
    assert "does not start" in heard.ends[0][1].why
    assert pool._failed_starts == MAX_FAILED_STARTS
    pool.shut_down()


def test_a_process_prepares_once_when_it_rests_behind_a_job(monkeypatch):
    monkeypatch.setattr(worker_process, "REST", 0.01)
    desk, happened = worker_process.Desk(io.StringIO()), []

    def carry_out(order):
        happened.append(order)
        if order == "last":
            raise EOFError

    def at_rest():
        happened.append("prepared")
        desk._orders.extend(["second"])
        threading.Timer(0.1, come_late).start()

    def come_late():
        with desk._changed:
            desk._orders.append("last")
            desk._changed.notify()

    monkeypatch.setattr(desk, "_carry_out", carry_out)
    desk._orders.append("first")
    with pytest.raises(EOFError):
        desk.work(at_rest)
    assert happened == ["first", "prepared", "second", "last"]


def test_compiling_in_a_process_is_known_to_the_pool_until_it_is_done(qtbot):
    pool = WorkerPool(arguments=["--cold"], size=1)
    both = []
    pool.changed.connect(lambda: both.append(pool.is_compiling))
    for on in (True, False):
        pool._on_reply(pool.workers[0], Compiling(on=on))
    assert both == [True, False]
    pool.shut_down()
