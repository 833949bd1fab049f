"""The Curve picture and the control of scans, without a display. Numbers are invented."""

import numpy as np
import pytest
import studies
from fake_starter import FakeStarter

from thalweg.study.events import Failed, ScanFinished, ScanPoint, ScanStarted
from thalweg.study.path import AnglePath, BondPath, SettingPath
from thalweg.study.scan_result import CurvePoint
from thalweg.study.scan_summary import summarise
from thalweg_app.presenters.curve import (
    CurveUnits,
    ShownCurve,
    curve_chart,
    curve_remarks,
    curve_sentence,
    curve_table,
    nearest_point,
    point_text,
    yield_figures,
    yield_table,
)
from thalweg_app.presenters.scan_control import ScanControl, numeric_settings, placed, scan_title


def point(index, coordinate, energy, flags=()):
    exact = -7.9 + 0.05 * (coordinate - 1.6) ** 2
    result = studies.result().model_copy(update={"energy": energy, "exact_energy": exact, "error": energy - exact})
    return CurvePoint(index=index, coordinate=coordinate, result=result, flags=flags)


def curve(count=9, flags=()):
    xs = np.round(np.linspace(1.0, 2.2, count), 10)
    return tuple(point(i, float(x), -7.9 + 0.05 * (x - 1.6) ** 2 + 1e-4 * (1 + i), flags if i == 3 else ()) for i, x in enumerate(xs))


@pytest.fixture
def control():
    starter = FakeStarter()
    scans = ScanControl(starter, studies.study)
    scans.starter = starter
    scans.edit("first", "1.0")
    scans.edit("last", "2.2")
    scans.edit("count", "9")
    return scans


def run_scan_events(scans, points):
    listener = scans.starter.last.listener
    spec = scans.live.spec
    listener.events([ScanStarted(axis="Li1-H2 distance", unit="angstrom", points=spec.points)])
    listener.events([ScanPoint(point=p, done=n, total=len(spec.points)) for n, p in enumerate(points, 1)])
    return listener, spec


def test_nothing_to_draw_says_what_to_do():
    assert "press Scan" in curve_chart(None, CurveUnits()).empty
    assert curve_table(None, CurveUnits()).rows == ()


def test_the_chart_holds_reference_exact_variational_and_errors_with_their_band():
    chart = curve_chart(ShownCurve("Variational", "Li1-H2 distance", "angstrom", curve()), CurveUnits())
    energy, error = chart.panels
    assert chart.x_title == "Li1-H2 distance / Å"
    assert [s.role for s in energy.series] == ["reference", "exact", "variational"]
    assert error.log
    assert error.series[0].y == pytest.approx([0.1 * (1 + i) for i in range(9)])
    assert error.band.upper == pytest.approx(1.5936, abs=1e-4)


def test_units_change_coordinates_and_errors():
    shown = ShownCurve("Variational", "Li1-H2 distance", "angstrom", curve())
    chart = curve_chart(shown, CurveUnits("bohr", "kcal/mol"))
    assert chart.x_title.endswith("/ bohr")
    assert chart.panels[0].series[0].x[0] == pytest.approx(1.8897261)
    assert chart.panels[1].series[0].y[0] == pytest.approx(0.0627509, rel=1e-4)
    assert "bohr" in point_text(shown, 1.8897, CurveUnits("bohr"))


def test_an_angle_is_not_converted():
    chart = curve_chart(ShownCurve("Variational", "Angle 2-1-3", "degree", curve()), CurveUnits("bohr"))
    assert chart.x_title == "Angle 2-1-3 / °"
    assert chart.panels[0].series[0].x[0] == 1.0


def test_flagged_points_are_marked_and_told():
    shown = ShownCurve("Variational", "Li1-H2 distance", "angstrom", curve(flags=("jump",)))
    marked = curve_chart(shown, CurveUnits()).panels[1].series[1]
    assert np.flatnonzero(~np.isnan(marked.y)).tolist() == [3]
    assert "jumps against its neighbours" in point_text(shown, 1.45, CurveUnits())
    assert curve_table(shown, CurveUnits()).rows[3][-1] == "jump"


def test_a_failed_point_has_a_row_with_its_sentence_and_no_place_in_the_curve():
    failed = CurvePoint(index=0, coordinate=0.1, result=None, flags=("failed",), failure="Atoms 1 and 2 are on one spot.")
    shown = ShownCurve("Variational", "r", "angstrom", (failed, *curve()))
    assert curve_chart(shown, CurveUnits()).panels[0].series[0].x.size == 9
    assert "one spot" in curve_table(shown, CurveUnits()).rows[0][-1]
    assert "one spot" in point_text(shown, 0.1, CurveUnits())


def test_the_nearest_point_is_opened():
    shown = ShownCurve("Variational", "r", "angstrom", curve())
    assert nearest_point(shown, 1.31).coordinate == pytest.approx(1.3)


def test_figures_and_remarks_of_a_finished_curve(control):
    control.start()
    _, spec = run_scan_events(control, curve())
    result = summarise(spec, list(curve()), 1.0)
    shown = ShownCurve("Variational", "Li1-H2 distance", "angstrom", curve(), result)
    names = [row[0] for row in yield_figures(shown, CurveUnits())]
    assert names[:2] == ["Minimum / Å", "E_min / Eh"]
    assert yield_figures(shown, CurveUnits())[0][2] == "1.60000"
    assert "non-parallelity error 0.8 mEh" in curve_sentence(shown, CurveUnits())
    assert any(text.startswith("Fit of the exact curve") for text in curve_remarks(shown))


def test_a_scan_runs_fills_in_and_is_kept(control):
    control.start()
    listener, spec = run_scan_events(control, curve()[:4])
    assert control.live.fraction == pytest.approx(4 / 9)
    assert control.live.seconds_left is not None
    assert len(control.shown.points) == 4
    listener.events([ScanFinished(result=summarise(spec, list(curve()), 1.0))])
    listener.done(None)
    assert control.live is None
    assert scan_title(control.chosen).startswith("Scan 1: ")
    assert control.shown.result.finished


def test_stopping_keeps_the_points_and_the_scan_can_be_completed(control):
    control.start()
    listener, spec = run_scan_events(control, curve()[:4])
    control.stop()
    assert control.starter.last.was_stopped
    listener.stopped()
    assert not control.chosen.result.finished
    assert "4 of 9 points" in scan_title(control.chosen)
    control.resume()
    assert [p["coordinate"] for p in control.starter.last.payload["done"]] == [p.coordinate for p in curve()[:4]]
    control.starter.last.listener.events([ScanFinished(result=summarise(spec, list(curve()), 1.0))])
    control.starter.last.listener.done(None)
    assert [s.number for s in control.scans] == [1]
    assert control.chosen.result.finished


def test_stopping_before_the_first_point_keeps_nothing_and_says_so(control):
    said = []
    control.told.connect(said.append)
    control.start()
    control.starter.last.listener.stopped()
    assert control.scans == ()
    assert "before there was any point" in said[0]


def test_a_defect_is_shown_and_points_survive(control):
    seen = []
    control.defect.connect(seen.append)
    control.start()
    listener, _ = run_scan_events(control, curve()[:2])
    listener.failed(Failed(what="The calculation ended", why="x", details="traceback"))
    assert seen
    assert len(control.chosen.result.points) == 2


@pytest.mark.parametrize(
    ("edits", "words"),
    [
        ({"first": "a"}, "is not a number"),
        ({"first": "2.2"}, "is empty"),
        ({"count": "1"}, "make no curve"),
        ({"spacing": "list", "values": ""}, "No points"),
        ({"path.second": 7}, "no atom 7"),
    ],
)
def test_what_cannot_be_scanned_is_said_before_starting(control, edits, words):
    for name, value in edits.items():
        control.edit(name, value)
    assert words in control.obstacle
    control.start()
    assert control.live is None


def test_a_bad_field_keeps_the_path_and_returns_its_error(control):
    error = control.edit("path.first", 0)
    assert "first" in error.field
    assert control.draft.path == BondPath()


def test_paths_are_chosen_and_atoms_picked(control):
    control.choose_path("angle")
    assert isinstance(control.draft.path, AnglePath)
    control.choose_path("bond")
    control.pick_atom(1)
    assert (control.draft.path.first, control.draft.path.second) == (2, 1)
    control.choose_path("setting")
    assert isinstance(control.draft.path, SettingPath)
    assert control.draft.path.setting in numeric_settings(studies.study())


def test_no_system_no_scan():
    scans = ScanControl(FakeStarter(), lambda: None)
    assert "nothing to scan" in scans.obstacle


@pytest.mark.parametrize("spacing", ["equal", "geometric"])
def test_far_too_many_points_are_refused_before_they_are_listed(control, spacing):
    control.edit("spacing", spacing)
    control.edit("count", "1e15")
    assert control.obstacle == "1,000,000,000,000,000 points are too many: a scan has 10,000 at the most. Ask for fewer points."


def finished(control):
    control.start()
    listener, spec = run_scan_events(control, curve())
    listener.events([ScanFinished(result=summarise(spec, list(curve()), 1.0))])
    listener.done(None)


def test_a_refinement_runs_only_new_points_and_takes_the_place_of_the_curve(control):
    finished(control)
    control.refine("minimum")
    payload = control.starter.last.payload
    assert payload["checked"]
    assert len(payload["scan"]["points"]) == 13
    assert len(payload["done"]) == 9
    assert len(control.live.points) == 9  # shown at once, under their new numbers
    spec = control.live.spec
    points = [placed(spec, curve()).get(i) or point(i, x, -7.9) for i, x in enumerate(spec.points)]
    control.starter.last.listener.events([ScanFinished(result=summarise(spec, points, 1.0))])
    control.starter.last.listener.done(None)
    assert [(s.number, len(s.result.points)) for s in control.scans] == [(1, 13)]


def test_another_scan_does_not_replace_the_first(control):
    finished(control)
    control.edit("count", "7")
    control.start()
    listener = control.starter.last.listener
    listener.events([ScanFinished(result=summarise(control.live.spec, list(curve(7)), 1.0))])
    listener.done(None)
    assert [s.number for s in control.scans] == [1, 2]


def test_literature_values_stand_beside_the_fit_and_none_is_invented(control):
    assert control.edit("literature.r_e", "1.5957") is None
    assert "r_e" in control.edit("literature.r_e", "-1").field
    finished(control)
    rows = yield_figures(control.shown, CurveUnits())
    assert rows[0][3] == "1.59570"
    assert {row[3] for row in rows[1:]} == {"–"}
    assert yield_table(rows).header[-1] == "Literature"
    control.edit("literature.r_e", "")
    assert control.draft.literature.r_e is None


def test_the_time_is_estimated_before_starting(control):
    control.foresee()
    assert control.starter.last.function.endswith(":foresee")
    control.starter.last.listener.done(12.0)
    assert control.seconds_ahead == 12.0
    listener = control.starter.last.listener
    control.edit("count", "30")
    listener.done(99.0)  # an answer to an older question
    assert control.seconds_ahead == 12.0


def test_the_spin_can_be_kept(control):
    control.edit("fixed_spin", True)
    assert control.spec().spin == "fixed"


def test_a_second_scan_waits_for_the_first(control):
    said = []
    control.told.connect(said.append)
    control.start()
    control.start()
    assert len(control.starter.jobs) == 1
    assert "A scan is running" in said[0]


def test_numeric_settings_are_those_of_the_system():
    assert "system.charge" in numeric_settings(studies.study(system=studies.molecule()))
