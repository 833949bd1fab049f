"""What tests of starts side by side share: studies, and a way to have another process take part for certain."""

import time

from thalweg.study import starts
from thalweg.study.executors import Local
from thalweg.study.spec import StudySpec, with_setting
from thalweg.systems import Molecule

#: Seconds that a loaded machine may take to start a process; nothing is timed by it.
PATIENCE = 120


def chain(atoms, **changes):
    system = Molecule(name=f"H{atoms}", atoms=tuple(("H", 0.0, 0.0, 0.9 * i) for i in range(atoms)))
    return StudySpec(system=system, **changes)


def with_settings(spec, **settings):
    for path, value in settings.items():
        spec = with_setting(spec, path.replace("__", "."), value)
    return spec


def endless(spec):
    """The study with a search that goes on for hours."""
    rules = {"stop__gradient": 0, "stop__evaluations": 0, "optimizer__max_iterations": 1_000_000}
    return with_settings(spec, ansatz__start="uniform-random", optimizer="gradient-descent", **rules)


class Eager(Local):
    """A pool pays at once."""

    def pays(self, points_left, running=0.0):
        return True


class Heard(list):
    """Events, in order of arrival."""

    @property
    def starts(self):
        return {e.start for e in self if e.kind == "iteration"}


def wait_for_another(monkeypatch, heard):
    """Start 0, which runs here, waits until another start has been heard of."""
    run_start = starts.run_start

    def patient(problem, exact, index, initial, emit, should_stop):
        limit = time.monotonic() + PATIENCE
        while index == 0 and not heard.starts and not should_stop():
            assert time.monotonic() < limit, "no other process has begun a start"
            time.sleep(0.01)
        return run_start(problem, exact, index, initial, emit, should_stop)

    monkeypatch.setattr(starts, "run_start", patient)


def without_times(result):
    """Everything of a result that must not depend on where its starts ran."""
    data = result.model_dump()
    for name in ("seconds", "elapsed", "preparation_seconds"):
        del data[name]
    for start in data["starts"]:
        del start["seconds"], start["trace"]["seconds"]
    return data
