import pytest
import studies
from fake_starter import FakeStarter

from thalweg.evaluate import Shots
from thalweg.optimize import COBYLA
from thalweg.study.events import Failed
from thalweg_app.presenters.figures import DerivedFigures


@pytest.fixture
def starter():
    return FakeStarter()


@pytest.fixture
def figures(starter):
    made = DerivedFigures(starter)
    made.needed.connect(made.inspect)
    return made


def test_figures_are_asked_for_and_shown_when_they_come(starter, figures):
    figures.follow(studies.study())
    assert not figures.is_fresh
    starter.last.listener.done(studies.figures().model_dump(mode="json"))
    assert figures.is_fresh
    assert figures.shown == studies.figures()


def test_a_newer_edit_withdraws_the_older_request_and_its_late_answer_is_not_shown(starter, figures):
    figures.follow(studies.study())
    old = starter.last
    figures.follow(studies.study(system=studies.molecule(charge=1)))
    assert old.was_stopped
    assert len(starter.jobs) == 2
    old.listener.done(studies.figures(qubits=99).model_dump(mode="json"))
    assert not figures.is_fresh
    starter.last.listener.done(studies.figures(qubits=7).model_dump(mode="json"))
    assert figures.shown.qubits == 7


def test_stale_figures_stay_visible_but_not_fresh(starter, figures):
    figures.follow(studies.study())
    starter.last.listener.done(studies.figures().model_dump(mode="json"))
    figures.follow(studies.study(system=studies.molecule(charge=1)))
    assert figures.shown == studies.figures()
    assert not figures.is_fresh


def test_an_edit_of_the_search_leaves_the_figures_fresh(starter, figures):
    figures.follow(studies.study())
    starter.last.listener.done(studies.figures().model_dump(mode="json"))
    figures.follow(studies.study(seed=99, starts=3))
    assert figures.is_fresh
    assert len(starter.jobs) == 1


@pytest.mark.parametrize("changes", [{"optimizer": COBYLA()}, {"evaluation": Shots(shots=77)}, {"reference": "2200"}])
def test_what_a_device_would_run_is_worked_out_anew_for_another_search(starter, figures, changes):
    figures.follow(studies.study())
    starter.last.listener.done(studies.figures().model_dump(mode="json"))
    figures.follow(studies.study(**changes))
    assert not figures.is_fresh
    assert len(starter.jobs) == 2


def test_going_back_shows_known_figures_without_asking_again(starter, figures):
    first, second = studies.study(), studies.study(system=studies.molecule(charge=1))
    figures.follow(first)
    starter.last.listener.done(studies.figures().model_dump(mode="json"))
    figures.follow(second)
    starter.last.listener.done(studies.figures(qubits=7).model_dump(mode="json"))
    figures.follow(first)
    assert figures.is_fresh
    assert figures.shown.qubits == 10
    assert len(starter.jobs) == 2


def test_a_refusal_carries_its_field_and_a_defect_its_traceback(starter, figures):
    refused, defects = [], []
    figures.refused.connect(lambda spec, error: refused.append((spec, error.field)))
    figures.defect.connect(defects.append)
    figures.follow(studies.study())
    starter.last.listener.failed(Failed(what="a", why="b", fix="c", field="system.basis"))
    assert refused == [(studies.study(), "system.basis")]
    figures.follow(studies.other_study())
    starter.last.listener.failed(Failed(what="a", details="Traceback"))
    assert defects[0].details == "Traceback"


def test_a_refusal_is_of_the_settings_as_they_are_when_it_comes(starter, figures):
    refused = []
    figures.refused.connect(lambda spec, error: refused.append(spec))
    figures.follow(studies.study())
    figures.follow(studies.study(seed=99))
    assert len(starter.jobs) == 1
    starter.last.listener.failed(Failed(what="No such basis", why="it is unknown", fix="Choose another", field="system.basis"))
    assert refused == [studies.study(seed=99)]


def test_a_set_up_that_does_not_validate_asks_for_nothing(starter, figures):
    figures.follow(None)
    assert not starter.jobs
    assert not figures.is_fresh
