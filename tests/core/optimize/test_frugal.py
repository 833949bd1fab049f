"""Shots of the next step, by hand."""

import numpy as np
import pytest
from support.sources import PlainSource

from thalweg.errors import StudyError
from thalweg.optimize import GCANS, ICANS, OperatorSampling
from thalweg.optimize.frugal import Knowledge
from thalweg.optimize.objective import CountedObjective, StopRules

#: L a = 0.5, so that 2 L a / (2 - L a) = 2/3.
KNOWN = Knowledge(gradient=np.array([1.0, 0.1, 2.0]), variance=np.array([30.0, 12.0, 60.0]), rate=0.5, step=0.25, bias=0.0)


def test_icans_by_hand():
    """Kuebler et al., Quantum 4, 263 (2020), Algorithm 1: s = ceil(2/3 S/g^2) = 20, 800, 10.

    Expected gain a shot, a/s [(1 - La/2) g^2 - La/2 S/s]: .25/20 (.75 - .375), .25/800 (.0075 - .00375), .25/10 (3 - 1.5): the third is the
    best, so that no component takes more than its 10.
    """
    assert ICANS().next_shots(KNOWN).tolist() == [10.0, 10.0, 10.0]
    first = Knowledge(np.array([1.0, 0.1, 0.2]), KNOWN.variance, 0.5, 0.25, 0.0)
    assert ICANS().next_shots(first).tolist() == [20.0, 20.0, 20.0]
    second = Knowledge(np.array([1.0, 0.1]), np.array([30.0, 0.03]), 0.5, 0.25, 0.0)  # .25/20 .375 against .25/2 (.0075 - .00375)
    assert ICANS().next_shots(second).tolist() == [20.0, 2.0]


def test_gcans_by_hand():
    """Gu et al., arXiv:2108.10434: s_k = 2/3 sigma_k sum sigma / |g|^2."""
    known = Knowledge(np.array([3.0, 4.0]), np.array([900.0, 400.0]), 0.5, 0.25, 0.0)
    assert GCANS().next_shots(known).tolist() == pytest.approx([2 / 3 * 30 * 50 / 25, 2 / 3 * 20 * 50 / 25])


def test_the_bias_keeps_shots_finite_where_the_gradient_vanishes():
    known = Knowledge(np.zeros(2), np.ones(2), 0.5, 0.25, 1e-6)
    assert np.all(np.isfinite(ICANS().next_shots(known)))
    assert np.all(np.isfinite(GCANS().next_shots(known)))


class Recording(PlainSource):
    """Gradients with a fixed variance of one shot, that remember the shots asked for."""

    def __init__(self, variance: np.ndarray) -> None:
        super().__init__(lambda x: (float(x @ x) / 2, x), variance.size, steepness=1.0)
        self._variance, self.asked, self.random = variance, [], []

    def sampled_gradient(self, x, shots, *, random_terms):
        self.asked.append(shots.tolist())
        self.random.append(random_terms)
        slopes = super().sampled_gradient(x, shots, random_terms=random_terms)
        return type(slopes)(slopes.gradient, self._variance / shots, slopes.cost, shots)


def run(optimiser, source, start):
    rules = StopRules(gradient=0)
    objective = CountedObjective(source, offset=0.0, rules=rules, target_energy=None, report=lambda p: None, should_stop=lambda: False)
    optimiser.minimise(objective, start, np.random.default_rng(1))
    return objective


def test_the_first_steps_of_gcans_by_hand():
    """Step 1/2, L = 1: after one step the running means are the first gradient (3, 4) and variances (9, 16); s = 2/3 (3, 4) 7/25."""
    source = Recording(np.array([900.0, 1600.0]))
    run(GCANS(step=0.5, max_iterations=2, bias=1e-12), source, np.array([3.0, 4.0]))
    assert source.asked == [[2.0, 2.0], [np.ceil(2 / 3 * 30 * 70 / 25), np.ceil(2 / 3 * 40 * 70 / 25)]]


def test_shots_keep_to_the_limits_of_the_settings():
    source = Recording(np.full(2, 1e9))
    run(ICANS(max_iterations=5, least_shots=10, most_shots=500), source, np.ones(2))
    assert source.asked[0] == [10.0, 10.0]
    assert source.asked[-1] == [500.0, 500.0]


def test_only_random_operator_sampling_asks_for_random_terms():
    for cls, expected in ((ICANS, False), (GCANS, False), (OperatorSampling, True)):
        source = Recording(np.ones(2))
        run(cls(max_iterations=2), source, np.ones(2))
        assert source.random == [expected] * 2


def test_a_step_past_the_bound_of_the_lipschitz_constant_is_refused():
    with pytest.raises(StudyError, match="too long") as error:
        run(ICANS(step=2.0), Recording(np.ones(2)), np.ones(2))
    assert error.value.field == "optimizer.step"


def test_the_step_is_one_over_the_bound_unless_it_is_given():
    source = Recording(np.full(1, 1e-12))
    objective = run(ICANS(max_iterations=2), source, np.ones(1))
    assert objective.best_energy == pytest.approx(0.0)  # one step of 1/L of a parabola of curvature L
