import pytest
import studies
from fake_starter import FakeRecent, FakeStarter

from thalweg.study.events import Failed, Finished, Iteration, Started
from thalweg_app.presenters.jobs import INSPECT, RUN
from thalweg_app.presenters.workbench import Workbench


@pytest.fixture
def bench():
    made = Workbench(FakeStarter(), FakeRecent())
    made.figures.needed.connect(made.figures.inspect)
    made.setup.load(studies.study())
    return made


def finish(bench, result):
    bench.starter.last.listener.events([Finished(result=result)])
    bench.starter.last.listener.done(None)


def test_a_loaded_set_up_is_inspected_at_once(bench):
    assert bench.starter.last.function == INSPECT
    bench.starter.last.listener.done(studies.figures().model_dump(mode="json"))
    assert bench.terms.label == "LiH, STO-3G"


def test_run_puts_its_result_into_the_ledger_and_the_answer(bench):
    bench.run()
    assert bench.starter.last.function == RUN
    finish(bench, studies.result())
    assert [r.number for r in bench.ledger.runs] == [1]
    assert bench.answer.kind == "good"
    assert "0.011 mEh" in bench.answer.sentence


def test_bad_input_keeps_run_from_starting(bench):
    before = len(bench.starter.jobs)
    bench.setup.edit("starts", "none")
    bench.run()
    assert len(bench.starter.jobs) == before


def test_what_inspection_refuses_marks_its_field(bench):
    bench.starter.last.listener.failed(
        Failed(what="Odd electrons", why="a singlet needs pairs", fix="Set multiplicity 2", field="system.multiplicity")
    )
    assert "system.multiplicity" in bench.setup.errors
    assert not bench.can_run


def test_the_picture_shows_the_run_under_way_before_the_selected_one(bench):
    bench.run()
    finish(bench, studies.result())
    bench.run()
    started = Started(label="LiH", energy_unit="hartree", reference_name="HF", reference_energy=-7.86, exact_energy=-7.88,
                      target_error=1e-3, n_parameters=4, n_starts=1)  # fmt: skip
    bench.starter.last.listener.events([started, Iteration(start=0, iteration=0, evaluations=1, energy=-7.86, gradient_norm=0.1, seconds=0.0)])
    assert bench.convergence("iteration").panels[0].series[-1].name == "Running"
    finish(bench, studies.result(3e-3))
    assert bench.convergence("iteration").panels[0].series[-1].name == "Run 2"


def test_use_this_set_up_puts_the_settings_of_a_run_back(bench):
    bench.run()
    finish(bench, studies.result(spec=studies.other_study()))
    bench.use_selected()
    assert bench.setup.spec == studies.other_study()


def test_a_check_is_answered_in_a_sentence_until_another_run_is_selected(bench):
    for error in (1e-5, 2e-5):
        bench.run()
        finish(bench, studies.result(error))
    bench.check_selected()
    bench.starter.last.listener.done({"deviation": 4e-12, "exact_deviation": None, "compared": "final energies"})
    assert bench.answer.kind == "good"
    assert "Run 2 repeats: it deviates by 4.0e−12 Eh" in bench.answer.sentence
    bench.ledger.select(1)
    assert "Run 1: Reaches" in bench.answer.sentence


def test_a_check_that_deviates_is_no_success(bench):
    bench.run()
    finish(bench, studies.result())
    bench.check_selected()
    bench.starter.last.listener.done({"deviation": 1e-4, "exact_deviation": 0.0, "compared": "final energies"})
    assert bench.answer.kind == "bad"
    assert "does not repeat" in bench.answer.sentence


def test_remarks_that_stand_in_the_set_up_are_not_repeated_under_the_answer(bench):
    bench.starter.last.listener.done(studies.figures(warnings=("Degenerate.",)).model_dump(mode="json"))
    bench.run()
    finish(bench, studies.result(remarks=("Degenerate.", "Another sector lies lower.")))
    assert bench.answer.remarks == ("Another sector lies lower.",)


def test_the_unit_of_differences_reaches_ledger_and_picture(bench):
    bench.run()
    finish(bench, studies.result())
    bench.choose_difference_unit("eV")
    assert "Error / eV" in bench.ledger.header
    assert bench.convergence("iteration").panels[1].y_title.endswith("eV")
