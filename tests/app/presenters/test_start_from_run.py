"""The start from a run of the ledger, without a display."""

from __future__ import annotations

import pytest
import studies
from fake_starter import FakeRecent, FakeStarter

from thalweg.ansatz import Adaptive
from thalweg.study.diagnosis_spec import Landscape
from thalweg.study.events import Failed
from thalweg.study.result import GrowthStep
from thalweg.study.spec import Neighbour, StudySpec
from thalweg_app.presenters.fields import fields_of
from thalweg_app.presenters.jobs import INSPECT, RUN
from thalweg_app.presenters.traces import growth_table
from thalweg_app.presenters.workbench import Workbench

FOUND = {"final_parameters": (0.1, -0.2), "parameter_labels": ("0a 0b -> 1a 1b", "0a -> 2a"), "parameters": 2}
START = Neighbour(parameters=(0.1, -0.2), labels=("0a 0b -> 1a 1b", "0a -> 2a"), source="run 1, LiH, STO-3G, UCCSD")


@pytest.fixture
def bench():
    made = Workbench(FakeStarter(), FakeRecent())
    made.figures.needed.connect(made.figures.inspect)
    made.setup.load(studies.study())
    made.said = []
    made.told.connect(made.said.append)
    return made


def test_a_start_is_one_edit_that_can_be_undone(bench):
    bench.ledger.add(studies.result(**FOUND))
    bench.start_from_selected()
    assert bench.setup.spec == studies.study(neighbour=START)
    assert bench.setup.start_line == "Starts from run 1, LiH, STO-3G, UCCSD: 2 parameters"
    assert bench.history.undo_text == "start from run 1"
    bench.history.undo()
    assert bench.setup.spec == studies.study()
    assert bench.setup.start_line == ""
    bench.history.redo()
    bench.setup.leave_start()
    assert not bench.setup.spec.neighbour.is_given
    bench.history.undo()
    assert bench.setup.spec.neighbour == START


def test_the_start_stays_while_other_settings_change_and_goes_with_the_run(bench):
    bench.ledger.add(studies.result(**FOUND))
    bench.start_from_selected()
    bench.setup.choose("ansatz", "uccd")
    bench.setup.edit("seed", "7")
    bench.run()
    assert bench.starter.last.function == RUN
    assert bench.starter.last.payload["neighbour"]["labels"] == list(START.labels)


def test_using_the_set_up_of_a_run_brings_back_where_it_started(bench):
    bench.ledger.add(studies.result(spec=studies.study(neighbour=START)))
    bench.use_selected()
    assert bench.setup.spec.neighbour == START


def test_a_run_that_was_cut_off_gives_no_start(bench):
    assert not bench.ledger.can_start
    bench.start_from_selected()
    bench.ledger.add(studies.result())
    assert not bench.ledger.can_start
    bench.start_from_selected()
    assert "Run 1 has no parameters to start from" in bench.said[0]
    assert bench.setup.start_line == ""
    bench.ledger.add(studies.result(**FOUND))
    assert bench.ledger.can_start


def test_the_figures_are_asked_for_anew_and_their_refusal_stands_at_the_start(bench):
    bench.starter.last.listener.done(studies.figures().model_dump(mode="json"))
    bench.ledger.add(studies.result(**FOUND))
    bench.start_from_selected()
    assert bench.starter.last.function == INSPECT
    assert bench.starter.last.payload["neighbour"]["source"] == START.source
    assert not bench.figures.is_fresh
    bench.starter.last.listener.failed(Failed(what="The search cannot start from run 1", why="nothing fits", fix="Take another", field="neighbour"))
    assert "nothing fits" in str(bench.setup.errors["neighbour"])
    assert not bench.can_run
    bench.setup.leave_start()
    assert bench.can_run
    assert bench.figures.is_fresh


@pytest.mark.parametrize(("path", "value"), [("continuation", "5"), ("ladder.on", True)])
def test_what_moves_or_refuses_a_start_is_inspected_again(bench, path, value):
    bench.ledger.add(studies.result(**FOUND))
    bench.start_from_selected()
    bench.starter.last.listener.done(studies.figures().model_dump(mode="json"))
    asked = len(bench.starter.jobs)
    bench.setup.edit(path, value)
    assert len(bench.starter.jobs) == asked + 1


def test_another_reference_is_inspected_again(bench):
    bench.starter.last.listener.done(studies.figures().model_dump(mode="json"))
    asked = len(bench.starter.jobs)
    bench.setup.edit("reference", "220000")
    assert len(bench.starter.jobs) == asked + 1


def test_no_generated_form_shows_the_numbers_of_a_start():
    assert "neighbour" not in {facts.name for facts in fields_of(StudySpec)}
    assert {facts.name for facts in fields_of(Neighbour)} == set()


def test_a_landscape_is_given_the_labels_of_its_points(bench):
    for _ in range(2):
        bench.ledger.add(studies.result(**FOUND))
    bench.ledger.tick(1, True)
    bench.diagnosis.edit("what", "landscape")
    bench.diagnosis.edit("first", "point")
    settings = Landscape.model_validate(bench.diagnosis.payload()["settings"])
    assert (settings.centre, settings.labels) == (START.parameters, START.labels)
    assert (settings.directions[0].point, settings.directions[0].labels) == (START.parameters, START.labels)


def test_the_first_step_of_growth_tells_what_it_began_with():
    began = GrowthStep(added=START.labels, parameters=2, two_qubit_gates=8, energy=-7.87, error=1e-2, largest_slope=0.1, iteration=2, evaluations=3)
    step = GrowthStep(added=("a",), parameters=3, two_qubit_gates=12, energy=-7.88, error=1e-3, largest_slope=0.0, iteration=4, evaluations=6)
    table = growth_table(studies.result(spec=studies.study(ansatz=Adaptive(), neighbour=START), growth=(began, step)))
    assert [row[1] for row in table.rows] == ["2 operators of run 1, LiH, STO-3G, UCCSD", "a"]
