"""The objective counts, remembers the best, and stops."""

import numpy as np
import pytest
from support.sources import NoisySource, PlainSource

from thalweg.errors import Stopped
from thalweg.optimize.objective import CountedObjective, StopRules

OFFSET = 3.0


def bowl(x):
    return OFFSET + float(x @ x)


def make(rules=None, *, should_stop=lambda: False, target=None, energy=bowl):
    reports = []
    objective = CountedObjective(
        PlainSource(lambda x: (energy(x), 2 * x), 2),
        offset=OFFSET,
        rules=rules or StopRules(gradient=0),
        target_energy=target,
        report=reports.append,
        should_stop=should_stop,
    )
    return objective, reports


def test_values_are_counted_from_the_offset_and_the_best_is_kept():
    objective, _ = make()
    for point in ([1.0, 0.0], [0.5, 0.0], [2.0, 0.0]):
        objective.value(np.array(point))
    assert objective.evaluations == 3
    assert objective.best_energy == OFFSET + 0.25
    assert objective.best_parameters.tolist() == [0.5, 0.0]


def test_begin_reports_the_start_as_iterate_zero_and_it_is_not_evaluated_again():
    objective, reports = make()
    start = np.array([1.0, 1.0])
    objective.begin(start)
    value, gradient = objective.value_and_gradient(start)
    assert (reports[0].iteration, reports[0].energy, reports[0].gradient_norm) == (0, OFFSET + 2.0, 2.0)
    assert (value, gradient.tolist(), objective.evaluations) == (2.0, [2.0, 2.0], 1)


def test_a_change_to_the_returned_gradient_does_not_reach_the_store():
    objective, _ = make()
    start = np.array([1.0, 1.0])
    objective.begin(start)
    objective.value_and_gradient(start)[1][:] = 99
    assert objective.value_and_gradient(start)[1].tolist() == [2.0, 2.0]


@pytest.mark.parametrize(
    ("rules", "points", "reason"),
    [
        (StopRules(gradient=0.1), [[1.0, 0], [0.01, 0]], "gradient"),
        (StopRules(gradient=0, energy_change=1e-3), [[1.0, 0], [0.01, 0], [0.001, 0], [0.0001, 0]], "energy-change"),
        (StopRules(gradient=0, evaluations=2), [[1.0, 0], [0.5, 0], [0.2, 0]], "evaluations"),
        (StopRules(gradient=0, at_target=True), [[1.0, 0], [0.01, 0]], "target"),
    ],
)
def test_each_rule_stops_with_its_own_reason(rules, points, reason):
    objective, _ = make(rules, target=OFFSET + 0.01)

    def walk():
        for point in points:
            objective.value_and_gradient(np.array(point))
            objective.iterate(np.array(point))

    with pytest.raises(Stopped) as stop:
        walk()
    assert stop.value.reason == reason


def test_the_person_stops_before_the_next_evaluation():
    objective, _ = make(should_stop=lambda: True)
    with pytest.raises(Stopped, match="stopped-by-person"):
        objective.value(np.zeros(2))
    assert objective.evaluations == 0


def test_a_time_limit_stops_after_the_first_energy_which_is_worth_keeping():
    objective, _ = make(StopRules(seconds=1e-9))
    objective.value(np.zeros(2))
    with pytest.raises(Stopped, match="seconds"):
        objective.value(np.ones(2))
    assert objective.evaluations == 1
    assert np.isfinite(objective.best_energy)


def test_an_energy_that_is_not_a_number_stops_the_search():
    objective, _ = make(energy=lambda x: float("nan"))
    with pytest.raises(Stopped) as stop:
        objective.value(np.zeros(2))
    assert stop.value.reason == "not-finite"


def test_an_iterate_other_than_the_last_point_is_reported_with_its_own_energy():
    objective, reports = make()
    objective.value_and_gradient(np.array([0.5, 0.0]))
    objective.value_and_gradient(np.array([2.0, 0.0]))
    objective.iterate(np.array([0.5, 0.0]))
    assert reports[-1].energy == OFFSET + 0.25
    assert reports[-1].gradient_norm == 1.0


def noisy(rules=None, *, error=0.01, target=None):
    reports = []
    source = NoisySource(lambda x: (bowl(x), 2 * x), 2, error)
    rules = rules or StopRules(gradient=0)
    return CountedObjective(source, offset=OFFSET, rules=rules, target_energy=target, report=reports.append, should_stop=lambda: False), reports


def test_under_noise_the_start_is_judged_by_the_simulation_and_costs_nothing():
    objective, reports = noisy()
    objective.begin(np.array([1.0, 1.0]))
    assert (reports[0].energy, reports[0].gradient_norm, reports[0].standard_error) == (OFFSET + 2.0, 2.0, None)
    assert (objective.spent.evaluations, objective.spent.shots) == (0, 0)


def test_under_noise_every_evaluation_circuit_and_shot_is_counted():
    objective, reports = noisy()
    objective.value(np.zeros(2))
    objective.value_and_gradient(np.ones(2))
    objective.iterate(np.ones(2))
    assert (objective.spent.evaluations, objective.spent.circuits, objective.spent.shots) == (6, 6, 600)
    assert (reports[-1].evaluations, reports[-1].circuits, reports[-1].shots) == (6, 6, 600)
    assert reports[-1].standard_error == 0.01
    assert reports[-1].noiseless == OFFSET + 2.0
    assert reports[-1].energy != reports[-1].noiseless


def test_under_noise_the_answer_is_the_last_iterate_measured_afresh_and_not_a_lucky_low_value():
    objective, _ = noisy(error=5.0)
    objective.begin(np.array([1.0, 0.0]))
    seen = [objective.value(np.array([0.1 * i, 0.0])) + OFFSET for i in range(20)]
    objective.iterate(np.array([1.9, 0.0]))
    before = objective.spent.shots
    objective.conclude()
    assert objective.best_parameters.tolist() == [1.9, 0.0]
    assert objective.best_energy not in seen
    assert objective.spent.shots == before + 100
    assert objective.best_standard_error == 5.0


def test_an_accepted_point_that_was_not_measured_is_reported_without_noise_and_without_error_bar():
    objective, reports = noisy()
    objective.value(np.zeros(2))
    objective.iterate(np.array([1.0, 0.0]))
    assert (reports[-1].energy, reports[-1].standard_error, reports[-1].noiseless) == (OFFSET + 1.0, None, OFFSET + 1.0)
    assert objective.spent.shots == 100


@pytest.mark.parametrize(("error", "stops"), [(0.001, True), (0.1, False)])
def test_the_target_counts_as_reached_only_where_the_error_bar_lies_below_it(error, stops):
    objective, _ = noisy(StopRules(gradient=0, at_target=True), error=error, target=OFFSET + 0.1)
    objective.value(np.zeros(2))
    if stops:
        with pytest.raises(Stopped, match="target"):
            objective.iterate(np.zeros(2))
    else:
        objective.iterate(np.zeros(2))


def test_a_gradient_within_its_noise_does_not_stop_the_search():
    objective, _ = noisy(StopRules(gradient=0.05), error=0.03)
    objective.value_and_gradient(np.zeros(2))
    objective.iterate(np.zeros(2))
    assert objective.iterations == 1


def test_a_sampled_energy_that_is_asked_for_again_is_sampled_again():
    objective, _ = noisy()
    assert objective.value(np.ones(2)) != objective.value(np.ones(2))
    assert objective.spent.shots == 200


def test_the_shot_limit_stops_the_search():
    objective, _ = noisy(StopRules(gradient=0, shots=250))
    for k in range(3):
        objective.value(np.array([float(k), 0.0]))
    with pytest.raises(Stopped, match="shots"):
        objective.value(np.array([9.0, 0.0]))
    assert objective.spent.shots == 300
