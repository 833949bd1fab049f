"""Starts side by side: the digits of a serial run, events of all, stops, and processes that are lost."""

import multiprocessing
import os
import pickle
import re
import signal
import subprocess
import sys
import time
from collections import deque
from multiprocessing import forkserver
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from support.starts import PATIENCE, Eager, Heard, chain, endless, wait_for_another, with_settings, without_times

from thalweg.errors import Stopped, StudyError
from thalweg.study import executors, start_workers, starts
from thalweg.study.executors import Local
from thalweg.study.problem import make_engine, prepare
from thalweg.study.run import run
from thalweg.study.spec import StudySpec
from thalweg.systems import LatticeModel
from thalweg.systems.hubbard import Hubbard
from thalweg.systems.lattice import Chain

CASES = {
    "coupled cluster": with_settings(chain(4, starts=4), ansatz__start="uniform-random"),
    "growth": with_settings(chain(4, starts=3), ansatz="adaptive", ansatz__start="small-random"),
    "layers": with_settings(chain(4, starts=3), ansatz="hardware-efficient", ladder__on=True, stop__evaluations=300),
    "shots": with_settings(chain(2, starts=3), evaluation="shots", optimizer="spsa", optimizer__max_iterations=20),
}
#: More iterates than a pipe holds, so that a process with this start cannot end while nobody reads.
LONG = with_settings(endless(chain(2, starts=3)), optimizer__max_iterations=5000)
#: Goes on until it is stopped.
ENDLESS = endless(chain(4, starts=3))


@pytest.fixture
def heard(monkeypatch):
    events = Heard()
    wait_for_another(monkeypatch, events)
    return events


@pytest.mark.parametrize("name", CASES)
def test_starts_side_by_side_give_the_digits_of_a_serial_run(name, heard):
    beside = run(CASES[name], heard.append, local=Eager(2))
    assert beside.elapsed is not None
    assert without_times(beside) == without_times(run(CASES[name]))


def test_long_loops_are_cut_alike_in_every_process(heard, monkeypatch):
    monkeypatch.setenv("NUMBA_NUM_THREADS", "2")  # 18 qubits are shared by threads, and sums depend on the shares
    spec = StudySpec(system=LatticeModel(lattice=Chain(sites=18)), starts=2, exact=False)
    spec = with_settings(spec, ansatz="hardware-efficient", ansatz__start="uniform-random", stop__evaluations=3)
    assert without_times(run(spec, heard.append, local=Eager(2))) == without_times(run(spec))


def test_every_iterate_of_every_start_is_heard_in_order(heard):
    result = run(CASES["coupled cluster"], heard.append, local=Eager(2))
    for index, record in enumerate(result.starts):
        told = [e for e in heard if e.kind == "iteration" and e.start == index]
        assert [e.energy for e in told] == list(record.trace.energy)
    ended = {e.start: (e.energy, e.reason) for e in heard if e.kind == "start-ended"}
    assert ended == {index: (r.energy, r.stop_reason) for index, r in enumerate(result.starts)}
    assert heard[-1].kind == "finished"


def test_steps_of_growth_and_stages_say_which_start_they_belong_to(heard):
    result = run(CASES["growth"], heard.append, local=Eager(2))
    for index in range(3):
        assert sum(e.kind == "growth-step" and e.start == index for e in heard) > 1
    stages = [e.text for e in heard if e.kind == "stage"]
    assert any(text.startswith("Start 2: Operator") for text in stages)
    assert result.growth


def test_a_stop_keeps_the_best_of_every_start_that_has_begun(heard):
    result = run(ENDLESS, heard.append, lambda: {0, 1} <= heard.starts, Eager(2))
    assert [s.stop_reason for s in result.starts] == ["stopped-by-person"] * 2
    for index, record in enumerate(result.starts):
        assert record.energy == min(e.energy for e in heard if e.kind == "iteration" and e.start == index)
    assert result.energy == pytest.approx(min(s.energy for s in result.starts), abs=1e-10)
    assert not multiprocessing.active_children()


def test_a_stop_before_any_energy_raises():
    with pytest.raises(Stopped):
        run(CASES["coupled cluster"], should_stop=lambda: True, local=Eager(2))


def killing(heard, times):
    """Takes events, and kills the other process at the first sign of start 1, `times` times."""

    def take(event):
        heard.append(event)
        if event.kind == "iteration" and (event.start, event.iteration) == (1, 0) and len(killed) < times:
            for process in multiprocessing.active_children():
                killed.append(process.pid)
                os.kill(process.pid, signal.SIGKILL)

    killed = []
    return take


def test_a_lost_process_costs_one_repetition_of_its_start(heard):
    result = run(LONG, killing(heard, 1), local=Eager(2))
    assert without_times(result) == without_times(run(LONG))
    assert sum(e.kind == "iteration" and (e.start, e.iteration) == (1, 0) for e in heard) == 2


def test_a_start_lost_twice_is_left_out_and_named(heard):
    result = run(LONG, killing(heard, 2), local=Eager(2))
    assert [s.seed - LONG.seed for s in result.starts] == [0, 2]
    assert any(remark.startswith("Start 2 is lost: its process ended") for remark in result.remarks)
    assert result.energy == pytest.approx(min(s.energy for s in result.starts), abs=1e-10)


@pytest.fixture
def clock(monkeypatch):
    """A clock for `starts` that goes on by `step` seconds whenever it is read."""
    made = SimpleNamespace(now=0.0, step=1e-4)

    def read():
        made.now += made.step
        return made.now

    monkeypatch.setattr(starts, "time", SimpleNamespace(perf_counter=read))
    monkeypatch.setattr(executors, "_server_runs", lambda: False)
    return made


class Fake:
    """Stands for the other processes: gives the news that the test has put in line."""

    made: list["Fake"] = []
    script: deque = deque()

    def __init__(self, problem, exact, count):
        self.count, self.is_closed, self.given = count, False, []
        self.worker = SimpleNamespace(index=None, give=self.give)
        Fake.made.append(self)

    def give(self, index):
        self.worker.index = index
        self.given.append(index)

    @property
    def running(self):
        return [] if self.worker.index is None else [self.worker.index]

    @property
    def is_alive(self):
        return bool(Fake.script)

    def news(self, seconds):
        return [(self.worker, Fake.script.popleft())] if Fake.script else []

    def dismiss(self, worker):
        worker.index = None

    def stop(self):
        pass

    def close(self):
        self.is_closed = True


@pytest.fixture
def fake(monkeypatch):
    monkeypatch.setattr(Fake, "made", [])
    monkeypatch.setattr(Fake, "script", deque())
    monkeypatch.setattr(starts, "StartWorkers", Fake)
    monkeypatch.setattr(starts, "TICK", 0.0)
    return Fake


def test_a_small_study_starts_no_process(clock, fake):
    result = run(CASES["coupled cluster"], local=Local(4))
    assert len(result.starts) == 4
    assert result.elapsed is None
    assert not fake.made


def test_a_long_start_calls_other_processes_while_it_runs(clock, fake):
    clock.step = 1.0
    run(CASES["coupled cluster"], local=Local(4))
    assert [f.count for f in fake.made] == [3]
    assert fake.made[0].is_closed


def test_without_a_second_core_or_a_second_start_no_process_is_started(clock, fake):
    clock.step = 1.0
    run(CASES["coupled cluster"], local=Local(1))
    run(CASES["coupled cluster"].model_copy(update={"starts": 1}), local=Local(4))
    run(CASES["coupled cluster"])
    assert not fake.made


def test_inside_a_worker_starts_run_one_after_another(clock, fake, monkeypatch):
    clock.step = 1.0
    monkeypatch.setattr(multiprocessing, "parent_process", lambda: multiprocessing.current_process())
    assert len(run(CASES["coupled cluster"], local=Local(4)).starts) == 4
    assert not fake.made


def test_processes_whose_states_do_not_fit_the_memory_budget_together_are_not_started(clock, fake):
    clock.step = 1.0
    engine = make_engine(prepare(chain(6)))
    for states, others in ((1.9, []), (2.9, [1])):
        spec = chain(6, starts=4, memory_gib=states * engine.memory_bytes() / 2**30, exact=False)
        fake.made.clear()
        run(spec, local=Local(4))
        assert [f.count for f in fake.made] == others


@pytest.mark.parametrize("error", [StudyError("Too many", "only 2 fit", "Take fewer"), ZeroDivisionError("a defect")])
def test_an_error_in_another_process_ends_the_run_with_its_words(fake, error):
    fake.script.extend([start_workers.Ready(), start_workers.Raised(start_workers._portable(error))])
    with pytest.raises(type(error), match=str(error)[:8]) as caught:
        run(ENDLESS, local=Eager(2))
    assert type(error).__name__ in "".join(caught.value.__notes__)
    assert fake.made[0].is_closed


def test_a_start_without_memory_beside_others_is_tried_again_alone(fake):
    fake.script.extend([start_workers.Ready(), start_workers.Raised(MemoryError())])
    result = run(CASES["coupled cluster"], local=Eager(2))
    first, again = fake.made
    assert first.given == [1]
    assert (again.count, again.given) == (1, [])  # the fake has nothing more to tell
    assert len(result.starts) == 3
    assert any("Start 2 is lost" in remark for remark in result.remarks)


@pytest.mark.parametrize(
    ("system", "ansatz"),
    [
        (LatticeModel(lattice=Chain(sites=6)), "alternating-operators"),
        (LatticeModel(lattice=Chain(sites=6)), "exchange-layers"),
        (LatticeModel(lattice=Chain(sites=4), model=Hubbard()), "uccsd"),
        (chain(4).system, "k-upccgsd"),
        (chain(4).system, "number-conserving"),
    ],
)
def test_a_problem_is_the_same_to_the_last_digit_on_the_other_side(system, ansatz):
    here = prepare(with_settings(StudySpec(system=system), ansatz=ansatz))
    there = pickle.loads(pickle.dumps(start_workers.plain_problem(here)))
    parameters = np.random.default_rng(3).uniform(-1.0, 1.0, here.program.n_parameters)
    (energy, gradient), other = make_engine(here).energy_and_gradient(parameters), make_engine(there).energy_and_gradient(parameters)
    assert energy == other[0]
    assert np.array_equal(gradient, other[1])
    assert there.prepared.mean_field is None


def test_an_error_that_cannot_travel_arrives_in_words():
    class LocalError(Exception):  # not to be found by its name elsewhere
        pass

    portable = start_workers._portable(LocalError("only here"))
    assert isinstance(portable, RuntimeError)
    assert "only here" in str(portable)


def test_the_server_of_processes_is_deaf_to_ctrl_c_from_its_first_moment():
    executors.start_process(os.getpid).join()
    status = Path(f"/proc/{forkserver._forkserver._forkserver_pid}/status").read_text()
    blocked = int(re.search(r"SigBlk:\s*(\w+)", status)[1], 16)
    assert blocked & 1 << signal.SIGINT - 1


PROGRAM = """
import multiprocessing, sys
from support.starts import Eager, chain, endless
from thalweg.study.run import run
from thalweg.study.spec import StudySpec
from thalweg.systems import LatticeModel
from thalweg.systems.hubbard import Hubbard
from thalweg.systems.lattice import Chain

def take(event):
    if event.kind == "iteration" and event.start == 1 and event.iteration == 0:
        print(*[p.pid for p in multiprocessing.active_children()], flush=True)

if __name__ == "__main__":
    run(endless(chain(4, starts=2)), take, local=Eager(2))
"""


def test_no_process_is_left_behind_when_the_program_is_killed():
    environment = os.environ | {"PYTHONPATH": os.pathsep.join(sys.path)}
    program = subprocess.Popen([sys.executable, "-c", PROGRAM], stdout=subprocess.PIPE, text=True, env=environment)
    others = [int(word) for word in program.stdout.readline().split()]
    program.kill()
    program.wait()
    assert others
    limit = time.monotonic() + PATIENCE
    while any(is_there(pid) for pid in others) and time.monotonic() < limit:
        time.sleep(0.02)
    assert not any(is_there(pid) for pid in others)


def is_there(pid):
    """Whether the process runs; what has ended may stay listed until its new parent has heard of it."""
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    stat = Path(f"/proc/{pid}/stat")
    return not (stat.exists() and stat.read_text().rpartition(")")[2].split()[0] == "Z")
