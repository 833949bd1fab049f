"""Depth ladder: energy against depth, each rung from the best of the last."""

from __future__ import annotations

from itertools import pairwise

import pytest

from thalweg.ansatz import ANSATZE, UCCSD, Adaptive, HardwareEfficient, KUpCCGSD, NumberConserving
from thalweg.errors import StudyError
from thalweg.study.events import Iteration, StepTaken
from thalweg.study.figures import inspect
from thalweg.study.run import run
from thalweg.study.spec import DepthLadder, StudySpec
from thalweg.systems import Molecule

FOUR = Molecule(name="chain", atoms=tuple(("H", 0.0, 0.0, 1.5 * i) for i in range(4)))
TWO = Molecule(name="pair", atoms=(("H", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 1.4)))
ON = DepthLadder(on=True)


def study(ansatz, system=FOUR, **more) -> StudySpec:
    return StudySpec(system=system, ansatz=ansatz, ladder=ON, **more)


@pytest.mark.parametrize("ansatz", [NumberConserving(depth=6), KUpCCGSD(k=4)], ids=lambda a: a.key)
def test_energy_falls_with_every_rung_until_the_target(ansatz):
    events = []
    result = run(study(ansatz), events.append)
    assert result.reached_target
    assert result.stop_reason == "target"
    assert [s.added for s in result.growth] == [(f"depth {d}",) for d in range(1, len(result.growth) + 1)]
    assert len(result.growth) < getattr(ansatz, ansatz.depth_field)
    assert all(b.energy < a.energy and b.parameters > a.parameters for a, b in pairwise(result.growth))
    assert all(s.largest_slope is None for s in result.growth)
    assert tuple(e.step for e in events if isinstance(e, StepTaken)) == result.growth
    assert result.energy >= result.exact_energy - 1e-9
    assert result.parameters == result.growth[-1].parameters == len(result.final_parameters)


def test_iterations_run_on_and_no_rung_begins_above_the_last():
    events = []
    result = run(study(NumberConserving(depth=3)), events.append)
    assert result.trace.iteration == tuple(range(result.iterations + 1))
    assert [e.iteration for e in events if isinstance(e, Iteration)] == list(result.trace.iteration)
    assert all(b <= a + 1e-9 for a, b in pairwise(result.trace.energy))
    for step in result.growth:
        assert result.trace.energy[step.iteration] == pytest.approx(step.energy, abs=1e-9)


def test_climbing_ends_where_one_layer_more_gains_nothing():
    result = run(study(NumberConserving(depth=10), TWO, target={"error": 1e-13}))
    assert result.stop_reason == "no-gain"
    assert len(result.growth) < 10
    assert result.error < 1e-9
    assert f"{len(result.growth)} times" in result.operator_order or len(result.growth) == 1


def test_the_depth_of_the_settings_is_the_last_rung():
    result = run(study(HardwareEfficient(depth=2), FOUR))
    assert len(result.growth) <= 2
    assert result.growth[0].parameters < result.growth[-1].parameters
    assert result.spec.ansatz.depth == 2


@pytest.mark.parametrize("cls", [cls for cls in ANSATZE if not getattr(cls, "depth_field", "") and cls is not Adaptive], ids=lambda c: c.__name__)
def test_a_trial_state_without_layers_is_refused(cls):
    with pytest.raises(StudyError) as error:
        run(study(cls(), TWO))
    assert error.value.field == "ladder.on"


def test_growth_needs_no_ladder_and_takes_no_notice_of_it():
    result = run(study(Adaptive(), TWO))
    assert result.reached_target
    assert result.growth[0].added == ()


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"ansatz": Adaptive(max_operators=1)}, ["no depth ladder"]),
        ({"ansatz": Adaptive(max_operators=1), "continuation": 2}, ["no depth ladder", "this one grows"]),
        ({"ansatz": NumberConserving(depth=1), "continuation": 2}, ["the depth ladder changes it"]),
        ({"ansatz": NumberConserving(depth=1)}, []),
    ],
)
def test_a_way_through_the_search_that_is_not_taken_is_remarked(changes, words):
    result = run(study(**changes))
    found = [text for text in result.remarks if text.startswith("There is no")]
    assert len(found) == len(words)
    assert all(word in text for word, text in zip(words, found, strict=True))


def test_a_ladder_without_layers_is_refused_before_the_work_and_told_by_the_figures():
    spec = study(UCCSD())
    assert "No depth ladder" in inspect(spec).warnings[-1]
    events = []
    with pytest.raises(StudyError, match="No depth ladder"):
        run(spec, events.append)
    assert not [event for event in events if event.kind == "started"]
