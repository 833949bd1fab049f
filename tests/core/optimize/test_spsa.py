"""Spall's gains and their calibration."""

import numpy as np
import pytest
from support.sources import PlainSource

from thalweg.optimize import SPSA
from thalweg.optimize.objective import CountedObjective, StopRules


def objective_of(function, n):
    rules = StopRules(gradient=0)
    return CountedObjective(PlainSource(function, n), offset=0.0, rules=rules, target_energy=None, report=lambda p: None, should_stop=lambda: False)


def test_the_gains_are_those_of_the_paper():
    """Spall, IEEE Trans. Aerosp. Electron. Syst. 34, 817 (1998): a_k = a/(A + k + 1)^.602, c_k = c/(k + 1)^.101."""
    optimiser = SPSA(max_iterations=100, perturbation=0.2, stability=0.1)
    assert optimiser.gains(0, 0.5) == (pytest.approx(0.5 / 11**0.602), pytest.approx(0.2))
    assert optimiser.gains(9, 0.5) == (pytest.approx(0.5 / 20**0.602), pytest.approx(0.2 / 10**0.101))


def test_calibration_gives_the_first_step_its_size_for_the_mean_slope_at_the_start():
    slope = np.array([3.0, -4.0])
    optimiser = SPSA(first_step=0.07, calibration=400)
    step = optimiser.calibrated(objective_of(lambda x: (float(slope @ x), slope), 2), np.zeros(2), np.random.default_rng(3))
    mean = (abs(3 + 4) + abs(3 - 4)) / 2  # |slope . direction| over the four directions of +-1
    assert optimiser.gains(0, step)[0] * mean == pytest.approx(0.07, rel=0.1)


def test_a_step_takes_two_energies_whatever_the_number_of_parameters():
    for n in (1, 7):
        objective = objective_of(lambda x: (float(x @ x), 2 * x), n)
        SPSA(max_iterations=10, step=0.1).minimise(objective, np.ones(n), np.random.default_rng(1))
        assert objective.evaluations == 20


def test_a_flat_start_is_no_division_by_zero():
    objective = objective_of(lambda x: (0.0, np.zeros(2)), 2)
    assert np.isfinite(SPSA().calibrated(objective, np.zeros(2), np.random.default_rng(1)))
