import pytest
import studies
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest

from thalweg_app.views.orbital_ladder import OrbitalLadder


@pytest.fixture
def ladder(qtbot):
    made = OrbitalLadder()
    qtbot.addWidget(made)
    made.resize(360, 150)
    made.show_rungs(studies.figures().ladder, True)
    made.show()
    return made


def test_degenerate_orbitals_share_a_row_and_the_highest_is_on_top(ladder):
    assert [[r.number for r in row] for row in ladder._rows] == [[6], [4, 5], [3], [2], [1]]


def test_a_click_toggles_the_orbital_under_the_pointer(qtbot, ladder):
    rung = studies.figures().ladder[4]
    with qtbot.waitSignal(ladder.toggled) as caught:
        QTest.mouseClick(ladder, Qt.MouseButton.LeftButton, pos=ladder._place(rung).center().toPoint())
    assert caught.args == [5]


def test_the_keyboard_reaches_every_orbital(qtbot, ladder):
    toggled = []
    ladder.toggled.connect(toggled.append)
    for _ in range(6):
        QTest.keyClick(ladder, Qt.Key.Key_Space)
        QTest.keyClick(ladder, Qt.Key.Key_Down)
    assert toggled == [6, 4, 5, 3, 2, 1]


def test_an_empty_ladder_is_drawn_and_takes_keys(qtbot, ladder):
    ladder.show_rungs((), True)
    QTest.keyClick(ladder, Qt.Key.Key_Space)
    assert not ladder.grab().isNull()
