import numpy as np
import pytest
import studies
from PySide6.QtCore import QCoreApplication, Qt
from PySide6.QtTest import QTest

from thalweg_app.colours import DARK, LIGHT, style_of
from thalweg_app.plots.chart_view import ChartView
from thalweg_app.plots.legend import entries_of
from thalweg_app.plots.pens import MAX_WIDE_POINTS
from thalweg_app.presenters.chart import Chart, Panel, Series
from thalweg_app.presenters.tables import state_chart, terms_chart, terms_of_result
from thalweg_app.presenters.traces import convergence, shown_result

RUN = convergence(shown_result(1, studies.result()), [shown_result(2, studies.result(3e-3))])


@pytest.fixture
def view(qtbot):
    made = ChartView("Convergence")
    qtbot.addWidget(made)
    made.resize(800, 600)
    made.set_palette(LIGHT)
    made.show()
    return made


def ranges(view, i=0):
    return view._panels[i].item.getViewBox().viewRange()


def test_an_empty_chart_says_what_to_do(view):
    view.show_chart(convergence(None))
    assert view._stack.currentWidget() is view._empty
    assert "Run" in view._empty.text()


@pytest.mark.parametrize("steps", [0, 1, 2, 3, 4])
def test_a_chart_shown_while_its_axes_are_built_ahead_is_whole(view, steps):
    ahead = view.prepare(RUN)
    for _ in range(steps):
        next(ahead, None)
    view.show_chart(RUN)
    assert list(ahead) == []  # nothing is built beside what is shown
    assert len(view._panels) == len(RUN.panels)
    assert view._panels[1].item.getAxis("bottom").style["showValues"]
    assert not view._panels[0].item.getAxis("bottom").style["showValues"]
    (_, _), (low, high) = ranges(view)
    assert low < studies.EXACT < studies.REFERENCE < high


def test_everything_drawn_is_inside_the_range(view):
    view.show_chart(RUN)
    (x0, x1), (y0, y1) = ranges(view)
    assert x0 < 0
    assert x1 > 13
    assert y0 < studies.EXACT
    assert y1 > studies.REFERENCE
    (_, _), (low, high) = ranges(view, 1)
    assert low < np.log10(1.1e-2)
    assert high > np.log10(20)


def test_panels_share_their_horizontal_axis(view):
    view.show_chart(RUN)
    view._panels[0].item.setXRange(2, 5, padding=0)
    assert ranges(view, 1)[0] == pytest.approx([2, 5], abs=0.2)


def test_curves_are_reused_when_data_grow(view):
    view.show_chart(RUN)
    curve = view._panels[0]._curves["Run 1"]
    view.show_chart(convergence(shown_result(1, studies.result(1e-7))))
    assert view._panels[0]._curves["Run 1"] is curve
    assert "Run 2" not in view._panels[0]._curves


def test_the_range_follows_the_data_until_the_person_zooms(view):
    view.show_chart(RUN)
    QTest.keyClick(view, Qt.Key.Key_Plus)
    zoomed = ranges(view)
    view.show_chart(RUN)
    assert ranges(view) == zoomed
    QTest.keyClick(view, Qt.Key.Key_0)
    assert ranges(view) != zoomed


def test_the_arrow_keys_move_the_picture(view):
    view.show_chart(RUN)
    (x0, _), _ = ranges(view)
    QTest.keyClick(view, Qt.Key.Key_Right)
    assert ranges(view)[0][0] > x0


def test_the_read_out_names_every_curve_at_the_nearest_point(view):
    view.show_chart(RUN)
    place, texts = view._panels[0].read_out(3.2)
    assert place == 3.0
    assert texts[0].startswith("Run 1 -7.8")
    assert texts[1].startswith("Run 2 -7.8")


def test_the_read_out_of_bars_names_the_category(view):
    view.show_chart(state_chart(studies.result()))
    _, texts = view._panels[0].read_out(0.9)
    assert texts == ["200002", "Trial state 0.0142", "Exact 0.0141"]
    assert view._panels[0].read_out(99.0) is None


@pytest.mark.parametrize("chart", [RUN, terms_chart(terms_of_result(studies.result())), state_chart(studies.result(), log=True)])
@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_every_picture_is_drawn_in_both_appearances(view, chart, palette):
    view.set_palette(palette)
    view.show_chart(chart)
    QCoreApplication.processEvents()  # the drawing is laid out when it is first needed
    image = view.grab().toImage()
    colours = {image.pixelColor(x, y).name() for x in range(0, image.width(), 7) for y in range(0, image.height(), 7)}
    assert palette.paper.lower() in colours
    assert len(colours) > 2


def test_long_curves_are_drawn_thin_and_without_marks(view):
    n = 10 * MAX_WIDE_POINTS
    long = Chart("Long", "x", (Panel("y", (Series("a", np.arange(n, dtype=float), np.sin(np.arange(n) / 500)),)),))
    view.show_chart(long)
    curve = view._panels[0]._curves["a"]
    assert curve.opts["pen"].width() == 1
    assert curve.opts["symbol"] is None


def test_the_legend_names_each_entry_once(view):
    names = [name for name, *_ in entries_of(RUN, LIGHT)]
    assert names == ["Run 1", "Run 2", "Hartree-Fock", "Exact"]


@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_roles_differ_without_colour(palette):
    looks = {(s.dash, s.mark) for s in (style_of(r, 0, palette) for r in ("variational", "exact", "reference", "overlay", "classical"))}
    assert len(looks) == 5
    overlays = {(s.dash, s.mark) for s in (style_of("overlay", k, palette) for k in range(6))}
    assert len(overlays) == 6


@pytest.mark.parametrize("palette", [LIGHT, DARK])
@pytest.mark.parametrize("name", ["ink", "muted", "accent", "good", "warning", "bad"])
def test_text_stands_out_from_the_paper(palette, name):
    # contrast of at least 4.5 as the web accessibility guidelines ask for (WCAG 2.1, 1.4.3)
    def luminance(colour):
        parts = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
        linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in parts]
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

    high, low = sorted((luminance(getattr(palette, name)), luminance(palette.paper)), reverse=True)
    assert (high + 0.05) / (low + 0.05) >= 4.5


def test_error_bars_are_drawn_and_stay_on_a_log_axis_when_they_reach_below_zero(view):
    x, y, spread = np.arange(3.0), np.array([1e-2, 1e-3, 1e-4]), np.array([1e-3, 2e-3, np.nan])
    series = Series("measured", x, y, spread=spread)
    view.show_chart(Chart("Measured", "x", (Panel("linear", (series,)), Panel("log", (series,), log=True))))
    plain, log = (panel._whiskers[0].opts for panel in view._panels)
    assert plain["top"] == pytest.approx([1e-3, 2e-3])
    assert log["bottom"][1] == 0.0  # 1e-3 - 2e-3 has no place in decades
    assert log["top"][1] == pytest.approx(np.log10(3))
    view.show_chart(Chart("Measured", "x", (Panel("linear", (Series("exact", x, y),)), Panel("log", (Series("exact", x, y),), log=True))))
    assert view._panels[0]._whiskers == []
