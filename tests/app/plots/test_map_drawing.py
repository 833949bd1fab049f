"""The map of energies. Its numbers are invented."""

import pytest
from PySide6.QtGui import QFontMetricsF, QGuiApplication
from PySide6.QtWidgets import QApplication

from thalweg.study.diagnosis_result import LandscapeResult
from thalweg_app.plots.map_drawing import MapDrawing


@pytest.fixture
def drawing(qtbot):
    made = MapDrawing()
    qtbot.addWidget(made)
    made.resize(700, 500)
    steps = (-1.0, 0.0, 1.0)
    energies = tuple(tuple(-2.18 + 0.05 * (x * x + y * y) for y in steps) for x in steps)
    found = LandscapeResult.model_construct(
        unit="hartree",
        labels=("random direction 1", "steepest descent"),
        steps=(steps, steps),
        energies=energies,
        lowest=(1, 1),
        verdict="one minimum",
    )
    made.show_map(found)
    made.show()
    qtbot.waitExposed(made)
    made.grab()  # axes find their widths when they are drawn
    QApplication.processEvents()
    return made


def test_the_title_of_the_scale_stands_clear_of_its_numbers(drawing):
    scale = drawing._scale
    numbers = QFontMetricsF(QGuiApplication.font()).horizontalAdvance("−2.18")
    title = scale.label.mapRectToItem(scale, scale.label.boundingRect())
    assert scale.label.toPlainText().strip() == "Energy / Eh"
    assert title.left() >= numbers


def test_every_axis_has_a_true_minus(drawing):
    for axis in (drawing._scale, drawing._plot.getAxis("left"), drawing._plot.getAxis("bottom")):
        low, high = axis.range
        texts = [t for spacing, values in axis.tickValues(low, high, 400.0) for t in axis.tickStrings(values, 1.0, spacing)]
        assert any(text.startswith("−") for text in texts)
        assert not any("-" in text for text in texts)
