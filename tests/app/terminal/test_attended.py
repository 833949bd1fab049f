"""Long work beside the terminal: events are shown in order, signals stop it, a second one ends it, libraries cannot spoil the answer."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import textwrap
import threading
import time

import pytest

from thalweg.errors import Stopped, StudyError
from thalweg.study.events import Stage
from thalweg_app.terminal.attended import attend, library_prints_to_stderr
from thalweg_app.terminal.display import SilentDisplay


class Recording(SilentDisplay):
    def __init__(self) -> None:
        self.events, self.said, self.ticks = [], [], 0

    def take(self, event) -> None:
        self.events.append(event)

    def tick(self) -> None:
        self.ticks += 1

    def say(self, text: str) -> None:
        self.said.append(text)


def test_the_value_comes_back_and_every_event_is_shown_in_order():
    display = Recording()

    def work(emit, should_stop):
        for i in range(200):
            emit(Stage(text=str(i)))
        return "done"

    assert attend(work, display) == ("done", 0)
    assert [event.text for event in display.events] == [str(i) for i in range(200)]


def test_the_display_ticks_while_no_event_comes():
    display = Recording()
    attend(lambda emit, should_stop: time.sleep(0.35), display)
    assert display.ticks >= 2


@pytest.mark.parametrize(("number", "status"), [(signal.SIGINT, 130), (signal.SIGTERM, 143)])
def test_a_signal_asks_the_work_to_stop_and_its_value_is_kept(number, status):
    display, begun = Recording(), threading.Event()

    def work(emit, should_stop):
        begun.set()
        while not should_stop():
            time.sleep(0.005)
        time.sleep(0.3)  # what it takes to gather the best
        return "best so far"

    threading.Thread(target=lambda: (begun.wait(5), os.kill(os.getpid(), number))).start()
    before = signal.getsignal(number)
    assert attend(work, display) == ("best so far", status)
    assert signal.getsignal(number) is before
    assert len(display.said) == 1


def test_work_that_stops_before_there_is_anything_gives_none():
    def work(emit, should_stop):
        os.kill(os.getpid(), signal.SIGINT)
        while not should_stop():
            time.sleep(0.005)
        raise Stopped("stopped-by-person")

    assert attend(work, Recording()) == (None, 130)


def test_what_the_work_raises_passes_on():
    def work(emit, should_stop):
        raise StudyError("A", "b", "C", "system.basis")

    with pytest.raises(StudyError, match=r"A: b\. C\."):
        attend(work, Recording())


def test_a_display_that_fails_ends_the_work_too():
    class Broken(SilentDisplay):
        def take(self, event) -> None:
            raise BrokenPipeError

    stopped = []

    def work(emit, should_stop):
        emit(Stage(text="one"))
        while not should_stop():
            time.sleep(0.005)
        stopped.append(True)

    with pytest.raises(BrokenPipeError):
        attend(work, Broken())
    assert stopped == [True]


def test_a_second_signal_ends_the_process_at_once():
    script = textwrap.dedent("""
        import time
        from thalweg_app.terminal.attended import attend
        from thalweg_app.terminal.display import SilentDisplay
        def work(emit, should_stop):
            print("begun", flush=True)
            time.sleep(60)
        attend(work, SilentDisplay())
    """)
    with subprocess.Popen([sys.executable, "-c", script], stderr=subprocess.PIPE, text=True) as process:
        assert process.stderr.readline() == "begun\n"  # printed by the work, so moved to standard error
        process.send_signal(signal.SIGINT)
        assert "once more ends at once" in process.stderr.readline()
        process.send_signal(signal.SIGINT)
        assert process.wait(timeout=10) == 130


def test_prints_of_libraries_do_not_reach_standard_output(capfd):
    print("answer", flush=True)
    with library_prints_to_stderr():
        print("from Python")
        os.write(1, b"from C\n")
    print("end", flush=True)
    out, err = capfd.readouterr()
    assert out == "answer\nend\n"
    assert "from C" in err
    assert "from Python" in err
