"""Progress in a pipe and on a screen."""

from __future__ import annotations

import io

import pytest
from rich.console import Console

from thalweg.study.events import Iteration, Stage, Started, StartEnded, Warned
from thalweg.study.spec import StudySpec
from thalweg.systems import Molecule
from thalweg_app.presenters.live import LiveRun
from thalweg_app.terminal import display as module
from thalweg_app.terminal.display import LineDisplay, LiveDisplay, SilentDisplay, iterate_text, make_display

SPEC = StudySpec(system=Molecule(atoms=(("H", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.7))))


def started(**changes) -> Started:
    fields = {"label": "H2", "energy_unit": "hartree", "reference_name": "Hartree-Fock", "reference_energy": -1.1, "exact_energy": -1.137}
    return Started(**{**fields, "target_error": 1.6e-3, "n_parameters": 3, "n_starts": 1, **changes})


def iteration(number: int, energy: float = -1.13, start: int = 0) -> Iteration:
    return Iteration(start=start, iteration=number, evaluations=number + 1, energy=energy, gradient_norm=0.1 * 0.5**number, seconds=0.5 * number)


def test_an_iterate_is_put_into_words_with_its_error_and_units():
    live = LiveRun(SPEC)
    live.take([started()])
    assert iterate_text(live, iteration(7)) == "iteration 7, energy -1.13000000 Eh, error 7 mEh"
    live.take([started(energy_unit="J", n_starts=3, exact_energy=None)])
    assert iterate_text(live, iteration(7, start=1)) == "start 2 of 3, iteration 7, energy -1.13000000 J"


def test_a_pipe_gets_a_line_a_stage_and_not_one_an_iterate(capsys):
    with LineDisplay(SPEC) as display:
        for event in (
            Stage(text="Mean field"),
            Stage(text="Mean field", fraction=0.5),
            Stage(text="Encoding"),
            Warned(text="Short bond."),
            started(),
        ):
            display.take(event)
        for number in range(500):
            display.take(iteration(number))
            display.tick()
    out, err = capsys.readouterr()
    assert out == ""
    lines = err.splitlines()
    assert lines[:3] == ["Mean field", "Encoding", "Warning: Short bond."]
    assert lines[3].startswith("iteration 0, energy")
    assert len(lines) < 8
    assert "\x1b" not in err


def test_a_pipe_is_told_the_time_left_once_it_can_be_known(capsys, monkeypatch):
    monkeypatch.setattr(module, "LINE_INTERVAL", 0.0)
    display = LineDisplay(SPEC)
    display.take(started())
    for number in range(10):
        display.take(iteration(number))
    assert "left" not in capsys.readouterr().err.splitlines()[0]
    display.take(iteration(10))
    assert "left" in capsys.readouterr().err


def test_a_screen_shows_energy_part_done_and_time_left():
    display = LiveDisplay(SPEC)
    screen = io.StringIO()
    display._bar.live.console = Console(file=screen, force_terminal=True, width=150)
    with display:
        display.take(Stage(text="Exact diagonalisation", fraction=0.5))
        display.tick()
        display.take(started())
        for number in range(10):
            display.take(iteration(number))
        display.tick()
    shown = screen.getvalue()
    assert "Exact diagonalisation" in shown
    assert "50%" in shown
    assert "iteration 9, energy -1.13000000 Eh" in shown
    assert "left" in shown
    assert shown.rstrip().endswith("\x1b[?25h") or "\x1b[?25h" in shown  # the cursor comes back


@pytest.mark.parametrize(("quiet", "screen", "kind"), [(True, True, SilentDisplay), (False, False, LineDisplay), (False, True, LiveDisplay)])
def test_the_display_follows_what_standard_error_is(quiet, screen, kind, monkeypatch):
    monkeypatch.setattr("sys.stderr", type("Stream", (io.StringIO,), {"isatty": lambda self: screen})())
    assert type(make_display(SPEC, quiet=quiet)) is kind


def test_of_starts_side_by_side_a_screen_shows_the_first_under_way_and_how_many_are_done():
    display = LiveDisplay(SPEC)
    screen = io.StringIO()
    display._bar.live.console = Console(file=screen, force_terminal=True, width=170)
    with display:
        display.take(started(n_starts=3))
        for event in (iteration(4, -1.13), iteration(9, -1.0, start=1), Stage(text="Start 2: Operator 3"), iteration(1, -1.1, start=2)):
            display.take(event)
        display.tick()
        display.take(StartEnded(start=0, energy=-1.13, reason="gradient", seconds=1.0))
        display.tick()
    shown = screen.getvalue()
    assert "start 1 of 3 (0 done, 3 under way), iteration 4, energy -1.13000000 Eh" in shown
    assert "start 2 of 3 (1 done, 2 under way), iteration 9, energy -1.00000000 Eh" in shown
    assert "Operator" not in shown


def test_a_pipe_gets_a_line_a_start_that_has_ended(capsys):
    with LineDisplay(SPEC) as display:
        for event in (started(n_starts=2), iteration(1, start=1), StartEnded(start=1, energy=-1.13, reason="gradient", seconds=1.0)):
            display.take(event)
    last = capsys.readouterr().err.splitlines()[-1]
    assert last == "Start 2 ended at -1.13000000 Eh: the largest gradient component fell below the limit; 1 of 2 done"
