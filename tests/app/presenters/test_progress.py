import math

import pytest
import studies

from thalweg.ansatz import Adaptive
from thalweg.optimize import Adam
from thalweg.optimize.objective import StopRules
from thalweg.study.events import Iteration, Stage, StartEnded
from thalweg_app.presenters.live import LiveRun
from thalweg_app.presenters.progress import estimate


def live(iterations, **changes):
    run = LiveRun(studies.study(**changes))
    run.take([Iteration(start=s, iteration=i, evaluations=i + 1, energy=-1.0, gradient_norm=n, seconds=t) for s, i, n, t in iterations])
    return run


def test_before_the_search_the_stage_is_shown():
    run = LiveRun(studies.study())
    run.take([Stage(text="Exact diagonalisation", fraction=0.25)])
    assert (estimate(run).text, estimate(run).fraction) == ("Exact diagonalisation", 0.25)


def test_a_gradient_that_falls_tenfold_a_second_foretells_the_end():
    run = live([(0, i, 10.0**-i, float(i)) for i in range(5)])  # 1e-4 at 4 s; the limit 1e-6 is two decades away
    now = estimate(run)
    assert now.seconds_left == pytest.approx(2.0)
    assert now.fraction == pytest.approx(4 / 6)


def test_a_time_limit_bounds_the_guess():
    run = live([(0, i, None, float(i)) for i in range(5)], stop=StopRules(seconds=10, evaluations=0))
    assert estimate(run).seconds_left == pytest.approx(6.0)


def test_an_evaluation_limit_bounds_the_guess():
    run = live([(0, i, None, float(i)) for i in range(5)], stop=StopRules(evaluations=10))
    assert estimate(run).seconds_left == pytest.approx(4.0)


def test_the_iterations_allowed_bound_the_guess():
    told = [(0, i, None, float(i)) for i in range(5)]
    assert estimate(live(told, optimizer=Adam(max_iterations=16))).seconds_left == pytest.approx(12.0)
    grown = live(told, optimizer=Adam(max_iterations=16), ansatz=Adaptive(), stop=StopRules(evaluations=0))
    assert estimate(grown).seconds_left is None  # each step of growth may take as many


def test_a_gradient_that_goes_up_and_down_while_it_falls_gives_a_steady_guess():
    norms = [10.0 ** (-i / 50 + 0.5 * math.sin(2.4 * i)) for i in range(220)]  # 1e-6 is met at iterate 300, 100 iterates a second
    told = [(0, i, norm, i / 100) for i, norm in enumerate(norms)]
    guesses = [estimate(live(told[:n])).seconds_left + told[n - 1][3] for n in range(150, 221)]
    assert min(guesses) == pytest.approx(3.0, rel=0.1)
    assert max(guesses) == pytest.approx(3.0, rel=0.1)


def end(run, start):
    run.take([StartEnded(start=start, energy=-1.0, reason="gradient", seconds=8.0)])


def test_starts_to_come_are_counted():
    run = live([(0, 0, None, 0.0), (0, 1, None, 8.0), (1, 0, None, 0.0), (1, 1, None, 1.0)], starts=4, stop=StopRules(seconds=10, evaluations=0))
    end(run, 0)
    assert estimate(run).seconds_left == pytest.approx(9.0 + 2 * 8.0)
    assert estimate(run).text == "Minimising: iteration 1, start 2 of 4"


def test_starts_side_by_side_share_the_time_to_come():
    told = [(0, 0, None, 0.0), (1, 0, None, 0.0), (0, 1, None, 8.0), (2, 0, None, 0.0), (1, 1, None, 4.0), (2, 1, None, 2.0)]
    run = live(told, starts=6, stop=StopRules(seconds=10, evaluations=0))
    end(run, 0)
    now = estimate(run)
    assert now.seconds_left == pytest.approx((6.0 + 8.0 + 3 * 8.0) / 2)
    assert now.fraction == pytest.approx(14.0 / (14.0 + 38.0))
    assert now.text == "Minimising: iteration 1, start 2 of 6 (1 done, 2 under way)"


def test_the_slowest_of_the_last_starts_bounds_the_time_left():
    run = live([(0, 0, None, 0.0), (1, 0, None, 0.0), (0, 1, None, 1.0), (1, 1, None, 9.0)], starts=2, stop=StopRules(seconds=10, evaluations=0))
    assert estimate(run).seconds_left == pytest.approx(9.0)


def test_between_two_starts_those_done_are_told():
    run = live([(0, 0, None, 0.0), (0, 1, None, 8.0)], starts=8)
    end(run, 0)
    assert estimate(run).text == "Minimising: 1 of 8 starts done"


def test_nothing_is_said_where_nothing_is_known():
    run = live([(0, 0, 0.1, 0.0)], stop=StopRules(evaluations=0))
    assert estimate(run).seconds_left is None


def test_a_rising_gradient_gives_no_guess():
    run = live([(0, i, 0.1 * (i + 1), float(i)) for i in range(6)], stop=StopRules(evaluations=0), ansatz=Adaptive())
    assert estimate(run).seconds_left is None


def test_stopping_is_said():
    run = live([(0, 0, 0.1, 0.0)])
    run.is_stopping = True
    assert "Stopping" in estimate(run).text
