import numpy as np
import pytest
import studies

from thalweg.study.events import Iteration, Started, StartEnded
from thalweg_app.presenters.live import LiveRun
from thalweg_app.presenters.traces import convergence, shown_live, shown_result


def panel(chart, i):
    return chart.panels[i]


def test_without_a_run_the_picture_says_what_to_do():
    chart = convergence(None)
    assert chart.is_empty
    assert "Run" in chart.empty


def test_energy_and_error_of_a_run():
    result = studies.result()
    chart = convergence(shown_result(1, result))
    energy, error = chart.panels
    np.testing.assert_array_equal(energy.series[-1].y, result.trace.energy)
    np.testing.assert_allclose(error.series[-1].y, (np.array(result.trace.energy) - studies.EXACT) * 1e3)
    assert error.log
    assert {level.name for level in energy.levels} == {"Hartree-Fock", "Exact"}
    assert energy.y_title == "Energy / Eh"
    assert error.y_title == "Error against exact / mEh"


def test_the_band_ends_at_the_target_and_says_so_in_words():
    band = convergence(shown_result(1, studies.result())).panels[1].band
    assert band.text == "Chemical accuracy, 1.59 mEh"
    assert band.upper == pytest.approx(1.5936, abs=1e-4)  # 1 kcal/mol by CODATA 2022
    other = convergence(shown_result(1, studies.result(target_error=1e-4))).panels[1].band
    assert other.text == "Target, 0.1 mEh"


@pytest.mark.parametrize("x", ["iteration", "evaluations", "seconds"])
def test_the_horizontal_axis_can_be_chosen(x):
    chart = convergence(shown_result(1, studies.result()), x=x)
    np.testing.assert_array_equal(chart.panels[0].series[-1].x, getattr(studies.result().trace, x))


def test_an_error_at_or_below_zero_leaves_a_gap():
    chart = convergence(shown_result(1, studies.result(exact_energy=studies.result().trace.energy[-1])))
    assert np.isnan(chart.panels[1].series[-1].y[-1])


def test_ticked_runs_are_laid_over_and_other_units_left_out():
    main, same, other = (shown_result(n, studies.result()) for n in (1, 2, 3))
    from dataclasses import replace

    chart = convergence(main, [same, replace(other, unit="J")])
    assert [s.name for s in chart.panels[0].series] == ["Run 2", "Run 1"]
    assert chart.panels[0].series[0].role == "overlay"


def test_classical_methods_are_lines_where_they_are_known():
    chart = convergence(shown_result(1, studies.result(classical={"mp2": -7.87, "ccsd(t)": None})))
    assert {"MP2"} == {level.name for level in chart.panels[0].levels if level.role == "classical"}


def test_without_an_exact_energy_the_gradient_takes_the_place_of_the_error():
    chart = convergence(shown_result(1, studies.result(exact_energy=None)))
    assert chart.panels[1].y_title == "Largest gradient component"
    assert chart.panels[1].band is None


def test_other_starts_are_faint_and_not_in_the_legend():
    result = studies.result()
    two = result.model_copy(update={"starts": (result.starts[0], result.starts[0]), "best_start": 1})
    faint = [s for s in convergence(shown_result(1, two)).panels[0].series if s.role == "faint"]
    assert len(faint) == 1
    assert not faint[0].legend


def test_errors_follow_the_unit_chosen():
    chart = convergence(shown_result(1, studies.result()), difference_unit="kJ/mol")
    assert chart.panels[1].y_title.endswith("kJ/mol")
    assert chart.panels[1].band.text == "Chemical accuracy, 4.18 kJ/mol"  # the thermochemical calorie is 4.184 J


def started(n_starts=1):
    return Started(
        label="LiH",
        energy_unit="hartree",
        reference_name="HF",
        reference_energy=-7.86,
        exact_energy=-7.88,
        target_error=1e-3,
        n_parameters=4,
        n_starts=n_starts,
    )


def test_a_run_under_way_is_drawn_from_its_first_iterate_on():
    live = LiveRun(studies.study())
    assert shown_live(live) is None
    live.take([started(), Iteration(start=0, iteration=0, evaluations=1, energy=-7.86, gradient_norm=0.1, seconds=0.0)])
    chart = convergence(shown_live(live))
    assert chart.panels[0].series[-1].name == "Running"
    assert chart.panels[0].series[-1].y.tolist() == [-7.86]


def test_of_starts_side_by_side_the_first_under_way_is_in_front_and_those_not_begun_are_empty():
    live = LiveRun(studies.study(starts=3))
    told = [(0, 0, -7.86), (2, 0, -7.8), (0, 1, -7.87), (2, 1, -7.85)]
    live.take([started(3), *(Iteration(start=s, iteration=i, evaluations=i, energy=e, gradient_norm=0.1, seconds=i) for s, i, e in told)])
    curves = convergence(shown_live(live)).panels[0].series
    assert [(c.name, c.role, c.y.tolist()) for c in curves] == [
        ("Running, start 2", "faint", []),
        ("Running, start 3", "faint", [-7.8, -7.85]),
        ("Running", "variational", [-7.86, -7.87]),
    ]
    live.take([StartEnded(start=0, energy=-7.87, reason="gradient", seconds=1.0)])
    assert convergence(shown_live(live)).panels[0].series[-1].y.tolist() == [-7.8, -7.85]
