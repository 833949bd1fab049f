"""Ticks of logarithmic axes."""

import math

import pytest
from PySide6.QtGui import QFontMetricsF, QGuiApplication

from thalweg_app.plots.axes import DecadeAxis, NameAxis, PlainAxis


@pytest.fixture
def axis(qtbot):
    return DecadeAxis("left")


def labels(axis, low, high, size=300.0):
    """What the axis says from 10**low to 10**high."""
    return [text for spacing, values in axis.tickValues(low, high, size) for text in axis.tickStrings(values, 1.0, spacing)]


@pytest.mark.parametrize(
    ("low", "high", "expected"),
    [
        (-4.2, -1.8, ["10⁻⁴", "10⁻³", "10⁻²"]),
        (-3.3, -2.2, ["10⁻³", "2×10⁻³", "5×10⁻³"]),  # one decade begins in sight
        (-2.9, -2.1, ["2×10⁻³", "5×10⁻³"]),  # none does
        (-2.9, -2.31, ["2×10⁻³", "3×10⁻³", "4×10⁻³"]),
        (math.log10(0.0312), math.log10(0.0353), ["3.2×10⁻²", "3.4×10⁻²"]),
        (0.1, 0.9, ["2", "5"]),
        (-0.4, 0.4, ["5×10⁻¹", "1", "2"]),
        (math.log10(9.5), math.log10(10.5), ["9.50", "10¹", "1.05×10¹"]),
    ],
)
def test_two_labels_show_however_few_decades_are_in_sight(axis, low, high, expected):
    assert labels(axis, low, high) == expected


def test_every_label_stands_at_its_number(axis):
    (_, values), *_ = axis.tickValues(-2.47, -2.44, 300.0)
    texts = axis.tickStrings(values, 1.0, 1.0)
    assert len(texts) > 1
    for value, text in zip(values, texts, strict=True):
        assert float(text.removesuffix("×10⁻³")) * 1e-3 == pytest.approx(10**value, rel=1e-9)


def test_a_low_axis_has_few_labels(axis):
    assert labels(axis, -3.95, -2.05, size=60.0) == ["2×10⁻⁴", "5×10⁻³"]
    assert len(labels(axis, -12.2, -0.8, size=110.0)) <= 6


@pytest.mark.parametrize(("low", "high"), [(-0.1, 3.1), (0.9, 4.2), (-3.0, 97.0), (0.2, 0.8)])
def test_counted_things_have_no_labels_between_whole_numbers(qtbot, low, high):
    axis = PlainAxis("bottom")
    axis.whole = True
    levels = axis.tickValues(low, high, 700.0)
    assert all(v == round(v) for _, values in levels for v in values)
    texts = [text for spacing, values in levels for text in axis.tickStrings(values, 1.0, spacing)]
    assert not any("." in text for text in texts)
    assert len(texts) >= 2 or high < 1


@pytest.mark.parametrize(("width", "shown"), [(900, ["11100111", "11011111"]), (90, ["1", "2"])])
def test_names_stand_under_bars_only_where_they_do_not_run_into_one_another(qtbot, width, shown):
    axis = NameAxis("bottom")
    axis.setGeometry(0, 0, width, 40)
    axis.set_names(("11100111", "11011111"))
    assert axis.tickStrings([0.0, 1.0], 1.0, 1.0) == shown


def test_names_as_wide_as_their_room_are_left_out(qtbot):
    axis = NameAxis("bottom")
    names = tuple(f"{k:08b}" for k in range(12))
    axis.set_names(names)
    widest = max(QFontMetricsF(QGuiApplication.font()).horizontalAdvance(name) for name in names)
    axis.setGeometry(0, 0, 12 * widest, 40)
    assert axis.tickStrings([float(i) for i in range(12)], 1.0, 1.0) == [str(i + 1) for i in range(12)]
