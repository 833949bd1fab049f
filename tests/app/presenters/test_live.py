"""A run of several starts while it runs, whose events come in turn."""

import pytest
import studies

from thalweg.study.events import Iteration, StartEnded
from thalweg_app.presenters.live import LiveRun


@pytest.fixture
def live():
    return LiveRun(studies.study(starts=4))


def iterate(start, number, energy=-1.0):
    return Iteration(start=start, iteration=number, evaluations=number + 1, energy=energy, gradient_norm=None, seconds=float(number))


def end(start, energy=-1.0):
    return StartEnded(start=start, energy=energy, reason="gradient", seconds=1.0)


def test_interleaved_iterates_go_to_their_starts(live):
    live.take([iterate(2, 0, -1.2), iterate(0, 0, -1.0), iterate(2, 1, -1.3), iterate(0, 1, -1.1)])
    assert [s.energy for s in live.starts] == [[-1.0, -1.1], [], [-1.2, -1.3]]
    assert live.best == (2, 1)


def test_the_start_looked_at_is_the_first_under_way_until_it_ends(live):
    assert live.lead is None
    live.take([iterate(1, 0), iterate(0, 0)])
    assert (live.lead, live.running) == (0, [0, 1])
    live.take([iterate(1, 1), end(0), iterate(2, 0)])
    assert (live.lead, live.running, live.ended) == (1, [1, 2], 1)


def test_when_none_is_under_way_the_best_one_is_looked_at(live):
    live.take([iterate(0, 0, -1.0), iterate(1, 0, -2.0), iterate(2, 0, -1.5), end(0), end(1), end(2)])
    assert live.lead == 1


def test_a_start_that_was_lost_and_begins_anew_forgets_its_first_iterates(live):
    live.take([iterate(1, 0, -5.0), iterate(1, 1, -6.0), iterate(1, 0, -1.0)])
    assert live.starts[1].energy == [-1.0]
    assert live.best == (1, 0)
