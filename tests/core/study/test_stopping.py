"""A search that a person stops keeps its best point, whichever engine runs it, and does not stop the next one."""

import pytest

from thalweg.study.run import run
from thalweg.study.spec import StudySpec, with_setting
from thalweg.systems import Molecule


@pytest.mark.parametrize("ansatz", ["uccsd", "hardware-efficient"])
def test_a_stopped_study_keeps_its_best_point_and_the_next_one_runs_to_its_end(ansatz):
    atoms = (("H", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.9))
    spec = with_setting(StudySpec(system=Molecule(name="H2", atoms=atoms)), "ansatz", ansatz)
    iterates = []

    def emit(event):
        if event.kind == "iteration":
            iterates.append(event.energy)

    stopped = run(spec, emit, lambda: len(iterates) >= 2)
    assert stopped.stop_reason == "stopped-by-person"
    assert stopped.energy == pytest.approx(min(iterates), abs=1e-10)
    finished = run(spec)
    assert finished.stop_reason == "gradient"
    assert finished.energy < stopped.energy


@pytest.mark.parametrize("changes", [{}, {"ansatz": "adaptive"}, {"ansatz": "number-conserving", "ladder.on": True}, {"continuation": 2}])
def test_a_time_limit_that_is_over_at_once_leaves_the_first_energy(changes):
    atoms = tuple(("H", 0.0, 0.0, 1.2 * i) for i in range(4))
    spec = with_setting(StudySpec(system=Molecule(name="four", atoms=atoms), starts=2), "stop.seconds", 1e-9)
    for field, value in changes.items():
        spec = with_setting(spec, field, value)
    result = run(spec)
    assert result.stop_reason == "seconds"
    assert len(result.starts) == 2
    assert all(len(start.trace.energy) == 1 for start in result.starts)
    assert result.energy == min(start.trace.energy[0] for start in result.starts)
