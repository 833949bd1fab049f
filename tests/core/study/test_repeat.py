"""A repetition compares like with like, also where the first run was ended from outside."""

from __future__ import annotations

import pytest

from thalweg.study import repeat as module
from thalweg.study.events import Finished, Iteration
from thalweg.study.executors import Local
from thalweg.study.repeat import OuterEnds, repeat
from thalweg.study.run import run
from thalweg.study.spec import StudySpec, with_setting
from thalweg.systems import Molecule

SPEC = StudySpec(system=Molecule(name="H4", atoms=tuple(("H", 0.0, 0.0, 0.9 * i) for i in range(4))))


@pytest.fixture(scope="module")
def first():
    return run(SPEC)


def test_a_finished_run_repeats_to_the_last_digits(first):
    events = []
    again = repeat(first, events.append)
    assert again.deviation < 1e-10
    assert again.exact_deviation < 1e-10
    assert again.within(1e-9)
    assert isinstance(events[-1], Finished)


def test_a_changed_energy_or_exact_energy_is_past_the_tolerance(first):
    assert not repeat(first.model_copy(update={"energy": first.energy - 1e-5})).within(1e-7)
    assert not repeat(first.model_copy(update={"exact_energy": first.exact_energy - 1e-5})).within(1e-7)


@pytest.mark.parametrize("key", ["gradient-descent", "cobyla", "l-bfgs-b"])
def test_a_run_stopped_by_hand_is_repeated_up_to_the_same_iterate(key):
    seen = []

    def stop() -> bool:
        return len([e for e in seen if isinstance(e, Iteration)]) > 5

    stopped = run(with_setting(SPEC, "optimizer", key), seen.append, stop)
    assert stopped.stop_reason == "stopped-by-person"
    again = repeat(stopped)
    assert again.deviation == 0.0
    assert len(again.result.starts[0].trace.energy) == len(stopped.starts[0].trace.energy)


def test_starts_that_were_never_begun_are_not_begun_in_the_repetition():
    seen = []

    def stop() -> bool:
        return any(isinstance(e, Iteration) and e.start == 1 and e.iteration >= 2 for e in seen)

    stopped = run(SPEC.model_copy(update={"starts": 5}), seen.append, stop)
    assert len(stopped.starts) == 2
    again = repeat(stopped)
    assert len(again.result.starts) == 2
    assert again.deviation < 1e-10


def test_a_start_cut_by_the_clock_does_not_end_the_starts_after_it():
    spec = SPEC.model_copy(update={"starts": 3})
    whole = run(spec)
    cut = whole.starts[1].model_copy(update={"stop_reason": "seconds", "iterations": 2})
    recorded = whole.model_copy(update={"starts": (whole.starts[0], cut, whole.starts[2])})
    again = repeat(recorded)
    assert len(again.result.starts) == 3
    assert again.result.starts[1].iterations == 2
    assert again.result.starts[2].stop_reason == whole.starts[2].stop_reason
    assert again.deviation < 1e-10


def test_only_the_starts_that_the_run_has_are_repeated():
    whole = run(SPEC.model_copy(update={"starts": 3}))
    energies = [s.energy for s in whole.starts]
    recorded = whole.model_copy(update={"starts": (whole.starts[0], whole.starts[2]), "energy": min(energies[0], energies[2])})
    again = repeat(recorded)
    assert [s.seed for s in again.result.starts] == [s.seed for s in recorded.starts]
    assert [s.energy for s in again.result.starts] == [energies[0], energies[2]]


def test_a_start_that_ends_by_itself_at_the_recorded_iterate_does_not_end_the_next():
    whole = run(SPEC.model_copy(update={"starts": 2}))
    cut = whole.starts[0].model_copy(update={"stop_reason": "seconds"})
    again = repeat(whole.model_copy(update={"starts": (cut, whole.starts[1])}))
    assert len(again.result.starts) == 2
    assert again.deviation < 1e-10


@pytest.mark.parametrize(("reason", "beside"), [("gradient", True), ("seconds", False)])
def test_starts_are_repeated_side_by_side_unless_one_is_to_be_ended_apart(first, monkeypatch, reason, beside):
    used = []
    monkeypatch.setattr(module, "run", lambda spec, emit, stop, local, only: used.append((local, only)) or first)
    local = Local(2)
    start = first.starts[0].model_copy(update={"stop_reason": reason})
    repeat(first.model_copy(update={"starts": (start,)}), local=local)
    assert used == [(local if beside else None, [0])]


def test_a_stopped_repetition_gives_no_figure(first):
    seen = []
    assert repeat(first, seen.append, lambda: any(isinstance(e, Iteration) for e in seen)) is None


def test_an_end_is_due_once(first):
    start = first.starts[0].model_copy(update={"stop_reason": "seconds", "iterations": 1})
    ends = OuterEnds(first.model_copy(update={"starts": (start,)}))
    iterate = Iteration(start=0, iteration=1, evaluations=2, energy=-1.0, gradient_norm=None, seconds=0.1)
    assert not ends.due()
    ends.take(iterate)
    assert ends.due()
    assert not ends.due()


def test_the_time_limit_of_the_first_run_does_not_cut_the_second(first, monkeypatch):
    used = []

    def record(spec, *_):
        used.append(spec)
        return first

    monkeypatch.setattr(module, "run", record)
    limited = first.model_copy(update={"spec": with_setting(SPEC, "stop.seconds", 1e-3)})
    repeat(limited)
    assert used[0].stop.seconds == 0.0
