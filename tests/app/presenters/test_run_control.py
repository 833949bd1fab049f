import pytest
import studies
from fake_starter import FakeStarter

from thalweg.storage.session import Run
from thalweg.study.events import Failed, Finished, Iteration, Stage, Started, StartEnded, Warned
from thalweg_app.presenters.jobs import CHECK, RUN
from thalweg_app.presenters.progress import estimate
from thalweg_app.presenters.run_control import RunControl


class Heard:
    def __init__(self, runs):
        self.finished, self.told, self.refused, self.defects, self.checked = [], [], [], [], []
        runs.finished.connect(self.finished.append)
        runs.told.connect(self.told.append)
        runs.refused.connect(lambda spec, error: self.refused.append(error))
        runs.defect.connect(self.defects.append)
        runs.checked.connect(self.checked.append)


@pytest.fixture
def starter():
    return FakeStarter()


@pytest.fixture
def runs(starter):
    return RunControl(starter, lambda spec: studies.figures())


@pytest.fixture
def heard(runs):
    return Heard(runs)


def started():
    return Started(
        label="LiH",
        energy_unit="hartree",
        reference_name="Hartree-Fock",
        reference_energy=studies.REFERENCE,
        exact_energy=studies.EXACT,
        target_error=1.6e-3,
        n_parameters=44,
        n_starts=1,
    )


def iteration(i, energy, start=0):
    return Iteration(start=start, iteration=i, evaluations=i + 1, energy=energy, gradient_norm=0.1, seconds=0.1 * i)


def test_a_run_is_started_with_its_settings_and_hands_its_result_over(starter, runs, heard):
    runs.submit(studies.study())
    assert (starter.last.function, starter.last.payload) == (RUN, studies.study().model_dump(mode="json"))
    starter.last.listener.events([started(), iteration(0, -7.86), Finished(result=studies.result())])
    starter.last.listener.done(None)
    assert heard.finished == [studies.result()]
    assert not runs.is_running


def test_events_fill_the_live_run(starter, runs):
    runs.submit(studies.study())
    starter.last.listener.events(
        [Stage(text="Mean field", fraction=0.5), Warned(text="careful"), started(), iteration(0, -7.86), iteration(0, -7.8, 1)]
    )
    assert runs.live.stage == "Mean field"
    assert runs.live.warnings == ["careful"]
    assert [s.energy for s in runs.live.starts] == [[-7.86], [-7.8]]
    assert runs.live.best == (0, 0)


def test_runs_wait_for_each_other_in_order(starter, runs, heard):
    runs.submit(studies.study())
    runs.submit(studies.other_study())
    assert len(starter.jobs) == 1
    assert len(runs.queue) == 1
    starter.last.listener.events([Finished(result=studies.result())])
    starter.last.listener.done(None)
    assert starter.last.payload == studies.other_study().model_dump(mode="json")
    assert not runs.queue


def test_a_waiting_run_can_be_withdrawn(starter, runs):
    runs.submit(studies.study())
    runs.submit(studies.other_study())
    runs.submit(studies.study())
    first, second = runs.queue
    runs.withdraw(first)
    assert runs.queue == [second]
    runs.withdraw(first)
    assert runs.queue == [second]


def test_a_run_that_has_begun_meanwhile_is_not_withdrawn_nor_another_in_its_stead(starter, runs):
    for study in (studies.study(), studies.other_study(), studies.study()):
        runs.submit(study)
    begun, waiting = runs.queue
    starter.last.listener.events([Finished(result=studies.result())])
    starter.last.listener.done(None)
    runs.withdraw(begun)
    assert runs.queue == [waiting]


def test_stop_keeps_the_best_that_the_calculation_hands_over(starter, runs, heard):
    runs.submit(studies.study())
    runs.stop()
    assert starter.last.was_stopped
    assert runs.live.is_stopping
    starter.last.listener.events([Finished(result=studies.result(3e-3, kind="not-converged"))])
    starter.last.listener.done(None)
    assert heard.finished[0].verdict_kind == "not-converged"


def test_a_run_ended_by_force_keeps_its_lowest_energy_and_never_counts_as_reached(starter, runs, heard):
    runs.submit(studies.study())
    starter.last.listener.events([started(), iteration(0, -7.86), iteration(1, studies.EXACT + 1e-6), iteration(2, -7.87)])
    runs.stop()
    starter.last.listener.stopped()
    kept = heard.finished[0]
    assert kept.energy == studies.EXACT + 1e-6
    assert kept.trace.energy == (-7.86, studies.EXACT + 1e-6, -7.87)
    assert not kept.reached_target
    assert "stopped by hand" in kept.verdict
    assert kept.final_parameters == ()


def test_of_starts_side_by_side_ended_by_force_those_that_had_an_energy_are_kept(starter, runs, heard):
    runs.submit(studies.study(starts=3, seed=5))
    told = [started(), iteration(0, -7.86), iteration(0, -7.8, start=2), iteration(1, -7.88, start=2)]
    starter.last.listener.events([*told, StartEnded(start=0, energy=-7.86, reason="gradient", seconds=1.0)])
    runs.stop()
    starter.last.listener.stopped()
    kept = heard.finished[0]
    assert [(s.seed, s.energy, s.stop_reason) for s in kept.starts] == [(5, -7.86, "gradient"), (7, -7.88, "stopped-by-person")]
    assert (kept.best_start, kept.energy) == (1, -7.88)


def test_while_the_best_point_is_examined_a_second_stop_ends_the_run_at_once(starter, runs, heard):
    runs.submit(studies.study())
    starter.last.listener.events([started(), iteration(0, -7.86)])
    runs.stop()
    starter.last.listener.noticed()
    assert "examining" in estimate(runs.live).text
    starter.last.was_stopped = False
    runs.stop()
    assert starter.last.was_stopped
    starter.last.listener.stopped()
    assert heard.finished[0].energy == -7.86


def test_a_run_stopped_before_any_point_says_so(starter, runs, heard):
    runs.submit(studies.study())
    runs.stop()
    starter.last.listener.stopped()
    assert heard.finished == []
    assert "before there was any point" in heard.told[0]


def test_a_killed_process_is_told_and_its_lowest_energy_kept(starter, runs, heard):
    runs.submit(studies.study())
    starter.last.listener.events([started(), iteration(0, -7.86)])
    starter.last.listener.failed(Failed(what="The calculation was cut off", why="its process was ended", fix="Run it again", details="stderr"))
    assert "cut off" in heard.told[0]
    assert heard.finished[0].stop_reason == "cut-off"
    assert not heard.defects
    assert not runs.is_running


def test_bad_input_is_told_and_marked_in_its_field(starter, runs, heard):
    runs.submit(studies.study())
    starter.last.listener.failed(Failed(what="Too many", why="few fit", fix="Take fewer", field="system.active_space"))
    assert heard.refused[0].field == "system.active_space"
    assert heard.told == ["Too many: few fit. Take fewer."]


def test_a_defect_goes_to_the_details_box_and_the_next_run_starts(starter, runs, heard):
    runs.submit(studies.study())
    runs.submit(studies.other_study())
    starter.last.listener.failed(Failed(what="defect", details="Traceback"))
    assert heard.defects[0].details == "Traceback"
    assert runs.is_running
    assert len(starter.jobs) == 2


def test_stop_all_empties_the_queue(starter, runs):
    runs.submit(studies.study())
    runs.submit(studies.other_study())
    runs.stop_all()
    assert not runs.queue
    assert starter.last.was_stopped


def test_a_check_states_the_deviation_and_makes_no_new_run(starter, runs, heard):
    runs.check(Run(number=4, result=studies.result()))
    assert starter.last.function == CHECK
    starter.last.listener.events([started(), iteration(0, -7.86)])
    starter.last.listener.done({"deviation": 3e-12, "exact_deviation": 1e-13, "compared": "final energies"})
    assert heard.finished == []
    assert (heard.checked[0].number, heard.checked[0].deviation) == (4, 3e-12)


def test_a_stopped_check_is_told_and_leaves_no_row(starter, runs, heard):
    runs.check(Run(number=4, result=studies.result()))
    starter.last.listener.events([started(), iteration(0, -7.86)])
    runs.stop()
    starter.last.listener.stopped()
    assert heard.finished == []
    assert "check of run 4" in heard.told[0]


def test_a_run_without_a_result_is_a_defect_and_no_success(starter, runs, heard):
    runs.submit(studies.study())
    starter.last.listener.done(None)
    assert heard.finished == []
    assert heard.defects
