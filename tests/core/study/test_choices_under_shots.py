"""Choices between measured numbers: slopes of a pool, layers of a ladder, starts; none may profit from luck."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from thalweg.ansatz import Adaptive, HardwareEfficient
from thalweg.errors import Stopped
from thalweg.evaluate import Exact, ExactWithError, Shots
from thalweg.optimize import SPSA
from thalweg.optimize.objective import StopRules
from thalweg.study.course import Course
from thalweg.study.growth import pool_slopes
from thalweg.study.problem import make_engine, prepare
from thalweg.study.run import run
from thalweg.study.spec import DepthLadder, StudySpec, Target
from thalweg.systems import Molecule
from thalweg.watch import SILENT

PAIR = Molecule(name="pair", atoms=(("H", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.7414)))
FOUR = Molecule(name="four", atoms=tuple(("H", 0.0, 0.0, 1.5 * i) for i in range(4)))


def growing(**changes) -> StudySpec:
    base = {"system": PAIR, "ansatz": Adaptive(max_operators=1), "evaluation": Shots(shots=4000), "optimizer": SPSA(max_iterations=10)}
    return StudySpec(**(base | changes))


@pytest.mark.parametrize("pool", ["spin-adapted", "qubit-excitations", "pauli-strings"])
@pytest.mark.parametrize("evaluation", [Exact(gradient="shift-rule"), Shots(shots=20_000)], ids=lambda e: e.key)
def test_slopes_of_a_pool_by_shift_rules_are_those_of_the_commutator(pool, evaluation):
    """The commutator form 2 <H psi|A|psi> of Grimsley et al. 2019, after one operator, against energies at shifted angles."""
    spec = growing(system=FOUR, ansatz=Adaptive(pool=pool), evaluation=evaluation)
    problem = prepare(spec)
    operators = spec.ansatz.operators(problem.ground)
    program, angle = operators.grown(problem.program, [3]), np.array([0.3])
    state = make_engine(replace(problem, program=program)).state(angle)
    exact = pool_slopes(problem, operators, SILENT)(state)
    course = Course(problem, None, lambda event: None, lambda: False, 0)
    whole = operators.grown(program, list(range(len(operators))))
    measured = course.measured_slopes(whole, np.concatenate([angle, np.zeros(len(operators))]), 1)
    if measured.variance is None:
        assert np.allclose(measured.gradient, exact, rtol=0, atol=1e-10)
    else:
        deviation = (measured.gradient - exact) / np.sqrt(np.maximum(measured.variance, 1e-24))
        informative = measured.variance > 1e-20
        assert np.abs(deviation[informative]).max() < 5.0
        assert (deviation[informative] ** 2).mean() == pytest.approx(1.0, abs=0.6)
        assert measured.cost.shots == 20_000 * measured.cost.evaluations


def test_growth_by_counted_slopes_takes_the_same_operators_as_by_the_simulation():
    spec = StudySpec(system=FOUR, ansatz=Adaptive())
    counted, told = (run(spec.model_copy(update={"evaluation": Exact(gradient=source)})) for source in ("shift-rule", "adjoint"))
    assert [s.added for s in counted.growth] == [s.added for s in told.growth]
    assert counted.evaluations > told.evaluations + 1000
    assert counted.circuits > 0


def test_a_run_whose_limit_is_spent_on_slopes_says_so():
    result = run(growing(system=FOUR, stop=StopRules(evaluations=50)))
    assert result.stop_reason == "evaluations"
    assert result.parameters == 0
    assert result.growth[0].evaluations > 50


def test_slopes_within_their_noise_append_nothing_and_are_no_convergence():
    result = run(growing(evaluation=Shots(shots=20), target=Target(error=1e-6), ansatz=Adaptive(max_operators=20)))
    assert result.stop_reason == "slope-noise"
    assert result.verdict_kind not in ("reached", "stationary")
    assert "statistical error" in result.verdict or result.verdict_kind in ("wrong-symmetry", "uncertain")


def test_only_slopes_without_any_count_carry_a_remark():
    def remarks(evaluation):
        return [r for r in run(growing(evaluation=evaluation)).remarks if "slopes of the pool" in r]

    assert remarks(ExactWithError())
    assert not remarks(Shots(shots=4000))
    assert not remarks(Exact())
    assert not remarks(ExactWithError(gradient="shift-rule"))


def test_a_measured_energy_reaches_the_target_by_two_standard_errors_only():
    course = Course(prepare(growing()), None, lambda event: None, lambda: False, 0)
    course.target_energy = -1.0
    descent = course.minimise(course.problem.program, np.zeros(0))

    def reaches(energy, error):
        return course.reaches_target(replace(descent, energy=energy, standard_error=error))

    assert reaches(-1.0, None)
    assert not reaches(-1.001, 0.001)
    assert reaches(-1.003, 0.001)


def test_the_best_of_several_starts_is_measured_once_more():
    """The lowest of eight equal energies with an error bar sigma lies 1.42 sigma too low on average (order statistics of the normal law)."""
    ansatz = HardwareEfficient(depth=1, start="zero")
    spec = growing(ansatz=ansatz, starts=8, evaluation=Shots(shots=100), optimizer=SPSA(max_iterations=1, step=1e-6))
    chosen, fresh = [], []
    for seed in range(12):
        result = run(spec.model_copy(update={"seed": 100 * seed + 1}))
        best = result.starts[result.best_start]
        assert best.energy == min(s.energy for s in result.starts)
        chosen.append((best.energy - result.energy) / best.standard_error)
        fresh.append((result.measured_energy - result.energy) / result.standard_error)
        assert result.shots == sum(s.shots for s in result.starts)
    assert np.mean(chosen) < -0.8
    assert abs(np.mean(fresh)) < 3 / np.sqrt(12)


def test_a_ladder_under_shots_climbs_on_only_where_the_fall_stands_out():
    spec = growing(ansatz=HardwareEfficient(depth=4), ladder=DepthLadder(on=True), evaluation=Shots(shots=200), optimizer=SPSA(max_iterations=5))
    result = run(spec)
    falls = [(a.energy - b.energy, 2 * np.hypot(a.standard_error, b.standard_error)) for a, b in pairwise(result.growth)]
    assert all(fall >= bar for fall, bar in falls)
    assert result.stop_reason == "no-gain"
    assert result.measured_energy != result.growth[-1].energy


@pytest.mark.parametrize("limit", [{"shots": 10}, {"evaluations": 1}, {"seconds": 1e-9}])
def test_slopes_of_a_pool_are_not_measured_past_a_limit(limit):
    result = run(growing(system=FOUR, stop=StopRules(**limit)))
    assert result.stop_reason == next(iter(limit))
    assert len(result.growth) == 1
    assert result.evaluations == 2  # the reference, and its last measurement
    assert result.shots == 8000


@pytest.mark.parametrize(("seconds", "asked", "reason"), [(1e-9, False, "seconds"), (0.0, True, "stopped-by-person")])
def test_measuring_the_slopes_of_a_pool_ends_at_the_time_limit_and_when_asked(seconds, asked, reason):
    spec = growing(system=FOUR, stop=StopRules(seconds=seconds))
    problem = prepare(spec)
    operators = spec.ansatz.operators(problem.ground)
    course = Course(problem, None, lambda event: None, lambda: asked, 0)
    whole = operators.grown(problem.program, list(range(len(operators))))
    with pytest.raises(Stopped, match=reason):
        course.measured_slopes(whole, np.zeros(len(operators)), 0)
