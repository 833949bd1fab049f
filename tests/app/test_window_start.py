"""The window: a search that starts from a run of the ledger."""

from __future__ import annotations

import studies
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from windows import jobs_of

from thalweg.study.events import Failed
from thalweg_app.presenters.jobs import INSPECT

FOUND = {"final_parameters": (0.1, -0.2), "parameter_labels": ("0a 0b -> 1a 1b", "0a -> 2a")}


def test_a_run_of_the_ledger_becomes_the_start_and_is_taken_away_by_the_keyboard(qtbot, window, starter):
    action, line = window.ledger_view.start_action, window.column.trial.start
    window.resize(1280, 700)
    assert not action.isEnabled()
    window.workbench.ledger.add(studies.result())
    assert not action.isEnabled()
    window.workbench.ledger.add(studies.result(**FOUND))
    assert line.isHidden()
    action.trigger()
    assert line.isVisible()  # the section opens, wherever it was
    qtbot.waitUntil(lambda: line.visibleRegion().boundingRect().height() == line.height())  # and the column scrolls to it
    assert line.text.text() == "Starts from run 2, LiH, STO-3G, UCCSD: 2 parameters"
    assert action in window.menuBar().actions()[1].menu().actions()
    line.button.setFocus(Qt.FocusReason.TabFocusReason)
    assert line.button.hasFocus()
    QTest.keyClick(line.button, Qt.Key.Key_Space)
    assert line.isHidden()
    window.menus.undo.trigger()
    assert line.isVisible()


def test_a_start_that_does_not_fit_is_told_beside_it(qtbot, window, starter):
    window.workbench.ledger.add(studies.result(**FOUND))
    window.ledger_view.start_action.trigger()
    window.workbench.setup.choose("ansatz", "hardware-efficient")
    qtbot.waitUntil(lambda: bool(jobs_of(starter, INSPECT)) and bool(jobs_of(starter, INSPECT)[-1].payload["neighbour"]["labels"]))
    jobs_of(starter, INSPECT)[-1].listener.failed(
        Failed(what="The search cannot start from run 1", why="no parameter is the same", fix="Start without it", field="neighbour")
    )
    line = window.column.trial.start
    assert line.problem.isVisible()
    assert "no parameter is the same" in line.problem.text()
    assert not window.column.run_button.isEnabled()
    assert not window.column.system._problem.isVisible()
    QTest.mouseClick(line.button, Qt.MouseButton.LeftButton)
    assert window.column.run_button.isEnabled()


def test_how_much_is_taken_over_is_told_while_it_is_known(qtbot, window, starter):
    window.workbench.ledger.add(studies.result(**FOUND))
    window.ledger_view.start_action.trigger()
    line = window.column.trial.start
    assert not line.taken.isVisible()
    qtbot.waitUntil(lambda: bool(jobs_of(starter, INSPECT)) and bool(jobs_of(starter, INSPECT)[-1].payload["neighbour"]["labels"]))
    jobs_of(starter, INSPECT)[-1].listener.done(studies.figures(start="2 of 44 parameters begin there.").model_dump(mode="json"))
    assert line.taken.text() == "2 of 44 parameters begin there."
    assert line.taken.isVisible()
    line.button.click()
    assert line.isHidden()


def test_the_button_has_a_name_and_a_tip(window):
    button = window.column.trial.start.button
    assert button.accessibleName() == "Start without that run"
    assert "as the trial state says" in button.toolTip()
    assert not button.icon().isNull()
