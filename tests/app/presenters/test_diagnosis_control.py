"""The control of diagnoses, without a display."""

import pytest
import studies
from fake_starter import FakeStarter

from thalweg.study.diagnosis_result import StartSpread
from thalweg.study.events import Failed, Stage
from thalweg_app.presenters.diagnosis_control import QUESTIONS, DiagnosisControl
from thalweg_app.presenters.history import History
from thalweg_app.presenters.ledger import Ledger
from thalweg_app.presenters.numbers import parse_wholes


@pytest.fixture
def ledger():
    return Ledger(History())


@pytest.fixture
def control(ledger):
    made = DiagnosisControl(FakeStarter(), studies.other_study, ledger)
    made.starter = made._starter
    made.said = []
    made.told.connect(made.said.append)
    return made


SPREAD = StartSpread(starts=1, lowest=-1.0, highest=-1.0, mean=-1.0, deviation=0.0, distinct=1, within_target=1, verdict="one start")


def test_trainability_takes_the_set_up_and_the_sizes_typed(control):
    control.edit("sizes", "4, 6-8")
    control.edit("layers", "1 2")
    payload = control.payload()
    assert payload["what"] == "trainability"
    assert payload["settings"]["qubits"] == [4, 6, 7, 8]
    assert payload["settings"]["layers"] == [1, 2]
    assert payload["settings"]["study"]["seed"] == studies.other_study().seed


def test_curvature_and_starts_need_a_selected_run(control, ledger):
    for what in ("curvature", "starts"):
        control.edit("what", what)
        assert "No run is selected" in control.obstacle
    ledger.add(studies.result())
    assert control.obstacle == ""
    assert control.payload()["result"]["label"] == studies.result().label


def test_a_landscape_goes_through_the_selected_point_and_towards_a_ticked_run(control, ledger):
    control.edit("what", "landscape")
    assert control.payload()["settings"]["centre"] == []
    ledger.add(studies.result())
    ledger.add(studies.result())
    control.edit("first", "point")
    assert "No other run is ticked" in control.obstacle
    ledger.tick(1, True)
    settings = control.payload()["settings"]
    assert settings["centre"] == list(studies.result().final_parameters)
    assert settings["directions"][0]["kind"] == "point"


def test_two_directions_make_a_map(control):
    control.edit("what", "landscape")
    control.edit("second", "parameter")
    control.edit("second_parameter", "3")
    directions = control.payload()["settings"]["directions"]
    assert [d["kind"] for d in directions] == ["random", "parameter"]
    assert directions[1]["parameter"] == 3


def test_a_map_over_one_direction_twice_is_refused(control, ledger):
    control.edit("what", "landscape")
    for kind, other in (("steepest", "none"), ("parameter", "parameter")):
        control.edit("first", kind)
        control.edit("second", kind)
        control.edit("second_parameter", "0")
        assert control.obstacle == "Both directions are the same: a map needs two. Choose another second direction, or none."
        control.edit("second_parameter", "1")
        assert bool(control.obstacle) == (other == "none")
    control.edit("first", "random")
    control.edit("second", "random")
    assert control.obstacle == ""


def test_a_range_that_runs_backwards_is_said(control):
    control.edit("layers", "4-1")
    assert control.obstacle == "The range '4-1' is empty: it ends below its beginning. Write it as 1-4."


def test_a_parameter_below_zero_is_said(control):
    control.edit("what", "landscape")
    control.edit("first", "parameter")
    control.edit("first_parameter", "-1")
    assert control.obstacle == "Setting 'parameter' cannot be -1: input should be greater than or equal to 0. Give a value that fits."


@pytest.mark.parametrize(
    ("name", "value", "words"), [("sizes", "a", "no list of numbers"), ("samples", "x", "whole number"), ("samples", "2", "samples")]
)
def test_bad_input_is_said_and_nothing_starts(control, name, value, words):
    control.edit(name, value)
    assert words in control.obstacle
    control.start()
    assert not control.starter.jobs
    assert control.said


def test_a_diagnosis_runs_tells_and_ends(control, ledger):
    ledger.add(studies.result())
    control.edit("what", "starts")
    control.start()
    assert control.is_running
    control.start()
    assert len(control.starter.jobs) == 1
    listener = control.starter.last.listener
    listener.events([Stage(text="Looking", fraction=0.5)])
    assert control.stage == "Looking, 50 %"
    listener.done(SPREAD.model_dump(mode="json"))
    assert control.found == SPREAD
    assert not control.is_running


def test_stopping_and_failing_are_said(control):
    defects = []
    control.defect.connect(defects.append)
    control.start()
    control.stop()
    assert control.starter.last.was_stopped
    control.starter.last.listener.stopped()
    control.start()
    control.starter.last.listener.failed(Failed(what="No gradients", why="one", fix="Two"))
    control.start()
    control.starter.last.listener.failed(Failed(what="x", details="traceback"))
    assert control.said == ["The diagnosis was stopped.", "No gradients: one. Two."]
    assert len(defects) == 1


def test_every_question_has_words():
    assert all(title and about for title, about in QUESTIONS.values())


def test_lists_of_whole_numbers():
    assert parse_wholes("2, 4 6-8") == (2, 4, 6, 7, 8)
    assert parse_wholes("") == ()
