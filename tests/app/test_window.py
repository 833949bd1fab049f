"""The window driven by keyboard and mouse, with jobs answered by hand."""

import pytest
import studies
import windows
from PySide6.QtCore import QSettings, Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QLabel, QLineEdit, QMenu, QMessageBox
from windows import add_run, curves, finish, iteration, jobs_of, press, started

from thalweg.study.events import Failed
from thalweg_app.main import begin, defect_hook
from thalweg_app.presenters.jobs import DRAW, INSPECT, RUN


def test_the_first_sample_is_shown_unchanged(qtbot, tmp_path):
    window = windows.make(qtbot, tmp_path)
    begin(window, [])
    assert window.workbench.setup.spec.system.name == "LiH"
    assert not window.isWindowModified()
    assert not window.menus.undo.isEnabled()


def test_figures_follow_an_edit_and_are_dimmed_meanwhile(qtbot, window, starter):
    qtbot.waitUntil(lambda: bool(jobs_of(starter, INSPECT)))
    line = window.column.sections["encoding"].line
    assert line.property("role") == "stale"
    jobs_of(starter, INSPECT)[-1].listener.done(studies.figures().model_dump(mode="json"))
    assert line.text() == "Jordan-Wigner, tapered: 12 → 10 qubits, 631 terms"
    assert line.property("role") == "figure"


def test_quick_edits_in_a_row_ask_for_figures_once(qtbot, window, starter):
    qtbot.waitUntil(lambda: bool(jobs_of(starter, INSPECT)))
    before = len(jobs_of(starter, INSPECT))
    for charge in ("1", "2", "3"):
        window.workbench.setup.edit("system.charge", charge)
    qtbot.waitUntil(lambda: len(jobs_of(starter, INSPECT)) > before)
    qtbot.wait(150)
    assert len(jobs_of(starter, INSPECT)) == before + 1


def test_ctrl_r_runs_what_is_still_being_typed(qtbot, window, starter):
    window.column.sections["optimizer"].set_open(True)
    entry = window.column.search.forms[0].editor("seed")
    entry.setFocus()
    entry.selectAll()
    QTest.keyClicks(entry, "42")
    QTest.keyClick(entry, Qt.Key.Key_R, Qt.KeyboardModifier.ControlModifier)
    assert jobs_of(starter, RUN)[0].payload["seed"] == 42


def test_a_run_fills_picture_status_ledger_answer_and_title(qtbot, window, starter):
    QTest.mouseClick(window.column.run_button, Qt.MouseButton.LeftButton)
    job = jobs_of(starter, RUN)[0]
    job.listener.events([started(), iteration(0, -7.862), iteration(1, -7.88)])
    qtbot.waitUntil(lambda: len(window.picture.view.chart.panels) == 2 and "iteration 1" in window.status.text)
    assert "running" in window.windowTitle()
    assert window.column.run_button.text() == "Add to queue"
    finish(starter)
    assert window.ledger_view.model.rowCount() == 1
    assert "0.011 mEh" in window.column.answer.text
    assert "run 1: reached" in window.windowTitle()
    assert window.isWindowModified()
    assert window.column.run_button.text() == "Run"


def test_escape_stops_the_run(qtbot, window, starter):
    window.run()
    window.setFocus()
    press(window, Qt.Key.Key_Escape, Qt.KeyboardModifier.NoModifier)
    assert jobs_of(starter, RUN)[0].was_stopped
    assert window.column.stop_button.text() == "Stop now"
    assert "Stopping" in window.status.text


def test_runs_queue_and_can_be_taken_off(qtbot, window, starter):
    window.run()
    window.run()
    assert window.status._waiting.text() == "1 waiting"
    menu = window.status._waiting.menu()
    menu.aboutToShow.emit()
    for _ in range(3):
        window.status.refresh()  # as a run under way tells of itself
    assert window.status._waiting.findChildren(QMenu) == [menu]
    menu.actions()[0].trigger()
    assert not window.workbench.runs.queue


def test_bad_input_disables_run_and_says_why(qtbot, window):
    window.column.sections["optimizer"].set_open(True)
    entry = window.column.search.forms[0].editor("starts")
    entry.setFocus()
    entry.selectAll()
    QTest.keyClicks(entry, "none")
    QTest.keyClick(entry, Qt.Key.Key_Tab)
    assert not window.column.run_button.isEnabled()
    assert "none" in window.column._obstacle.text()
    window.menus.undo.trigger()
    assert window.column.run_button.isEnabled()


def test_what_the_calculation_refuses_is_marked_in_its_field(qtbot, window, starter):
    window.run()
    jobs_of(starter, RUN)[0].listener.failed(Failed(what="Odd electrons", why="a singlet needs pairs", fix="Use 2", field="system.multiplicity"))
    row = next(r for r in window.column.system._forms["molecule"].rows if r.path == "system.multiplicity")
    assert "Odd electrons" in row.error.text()
    assert "Odd electrons" in window.status.text


def test_the_encoding_can_be_chosen_for_electrons_only(qtbot, window):
    section = window.column.sections["encoding"]
    section.set_open(True)
    assert window.column.encoding.choice.isVisible()
    window.workbench.setup.choose("system", "lattice")
    assert not window.column.encoding.choice.isVisible()
    assert "Every site is a qubit" in " ".join(label.text() for label in window.column.encoding.findChildren(QLabel) if label.isVisible())


def test_a_refused_reference_opens_the_section_where_it_stands(qtbot, window, starter):
    window.workbench.setup.edit("reference", "2200, 2ab0")
    assert not window.column.sections["ansatz"].is_open
    window.run()
    what = Failed(what="The determinants have different symmetries", why="no eigenstate mixes them", fix="Leave one out", field="reference")
    jobs_of(starter, RUN)[0].listener.failed(what)
    assert window.column.sections["ansatz"].is_open
    assert not window.column.sections["optimizer"].is_open
    form = next(f for f in window.column.trial.forms if any(r.path == "reference" for r in f.rows))
    assert form.fold.is_open
    assert "different symmetries" in next(r for r in form.rows if r.path == "reference").error.text()


def test_a_killed_calculation_is_told_and_the_window_lives_on(qtbot, window, starter):
    window.run()
    jobs_of(starter, RUN)[0].listener.failed(Failed(what="The calculation was cut off", why="no memory", fix="Run it again", details="x"))
    assert "cut off" in window.status.text
    window.run()
    finish(starter)
    assert window.ledger_view.model.rowCount() == 1


def test_a_defect_is_shown_with_details(qtbot, window, starter):
    window.run()
    jobs_of(starter, RUN)[0].listener.failed(Failed(what="defect", details="Traceback (most recent call last)"))
    box = windows.dialog(window, QMessageBox)
    assert "Traceback" in box.detailedText()


def test_an_exception_in_the_window_is_logged_and_shown(qtbot, window, capsys):
    try:
        raise ZeroDivisionError("by hand")
    except ZeroDivisionError as error:
        defect_hook(window)(type(error), error, error.__traceback__)
    assert "by hand" in windows.dialog(window, QMessageBox).detailedText()


def test_a_click_on_a_row_shows_its_run_and_the_space_bar_ticks_it(qtbot, window):
    add_run(window, 3e-3, 1e-5)
    view = window.ledger_view.view
    QTest.mouseClick(view.viewport(), Qt.MouseButton.LeftButton, pos=view.visualRect(window.ledger_view.model.index(0, 3)).center())
    assert window.workbench.ledger.selected.number == 1
    QTest.keyClick(view, Qt.Key.Key_Space)
    assert [r.number for r in window.workbench.ledger.ticked] == [1]
    qtbot.waitUntil(lambda: curves(window)[-1:] == ["Run 1"])


def test_ticked_runs_are_laid_over_the_picture(qtbot, window):
    add_run(window, 3e-3, 1e-5)
    index = window.ledger_view.model.index(0, 0)
    window.ledger_view.model.setData(index, Qt.CheckState.Checked.value, Qt.ItemDataRole.CheckStateRole)
    qtbot.waitUntil(lambda: curves(window) == ["Run 1", "Run 2"])


def test_delete_removes_a_run_and_undo_brings_it_back(qtbot, window):
    add_run(window, 3e-3, 1e-5)
    window.ledger_view.view.setFocus()
    QTest.keyClick(window.ledger_view.view, Qt.Key.Key_Delete)
    assert window.ledger_view.model.rowCount() == 1
    window.menus.undo.trigger()
    assert window.ledger_view.model.rowCount() == 2


def test_a_heading_sorts_the_ledger(qtbot, window):
    add_run(window, 3e-3, 1e-5)
    window.ledger_view.view.sortByColumn(6, Qt.SortOrder.AscendingOrder)
    assert [r.number for r in window.ledger_view.model.rows] == [2, 1]


def test_a_note_is_edited_in_its_cell(qtbot, window):
    add_run(window, 1e-5)
    model = window.ledger_view.model
    model.setData(model.index(0, model.columnCount() - 1), "baseline")
    assert window.workbench.ledger.run(1).note == "baseline"


def test_use_this_set_up_and_check_again_act_on_the_selected_run(qtbot, window, starter):
    window.workbench.ledger.add(studies.result(spec=studies.other_study()))
    window.ledger_view.use_action.trigger()
    assert window.workbench.setup.spec == studies.other_study()
    window.ledger_view.check_action.trigger()
    starter.last.listener.done({"deviation": 0.0, "exact_deviation": 0.0, "compared": "final energies"})
    assert "Run 1 repeats" in window.column.answer.text


@pytest.mark.parametrize("title", ["Convergence", "Hamiltonian", "State"])
def test_ctrl_and_a_digit_shows_a_picture(qtbot, window, title):
    add_run(window, 1e-5)
    place = [picture.title for picture in window.pictures].index(title)
    press(window, Qt.Key(Qt.Key.Key_1.value + place))
    qtbot.waitUntil(lambda: window.picture.title == title and not window.picture.view.chart.is_empty)


def test_f1_explains_the_field_with_the_focus(qtbot, window):
    entry = window.column.system._forms["molecule"].editor("system.basis")
    entry.setFocus()
    window.help.show_for(entry)
    assert "Basis set" in window.help.label.text()
    window.help.hide()


def test_figures_stay_upright_or_slanted_as_they_are_when_the_appearance_changes(qtbot, window, starter):
    lines = {name: section.line for name, section in window.column.sections.items() if name != "optimizer"}
    qtbot.waitUntil(lambda: bool(jobs_of(starter, INSPECT)))
    for looks in ("dark", "light"):
        assert all(line.font().italic() for line in lines.values())
        window.theme.choose(looks)
    jobs_of(starter, INSPECT)[-1].listener.done(studies.figures().model_dump(mode="json"))
    for looks in ("dark", "light"):
        assert not any(line.font().italic() for line in lines.values())
        window.theme.choose(looks)
    assert not any(line.font().italic() for line in lines.values())


@pytest.mark.parametrize("appearance", ["dark", "light"])
def test_appearance_changes_everything_at_once_and_is_remembered(qtbot, window, appearance):
    add_run(window, 1e-5)
    window.theme.choose(appearance)
    assert window.theme.palette.name == appearance
    assert QSettings().value("appearance") == appearance
    assert window.picture.palette_now.name == appearance


def test_the_picture_is_copied_and_its_numbers_are_saved(qtbot, window, tmp_path):
    add_run(window, 1e-5)
    QGuiApplication.clipboard().clear()
    window.redraw()
    window.picture.copy_image()
    assert not QGuiApplication.clipboard().pixmap().isNull()
    window.picture.save_numbers(tmp_path / "a.csv")
    assert "Energy / Eh,Run 1" in (tmp_path / "a.csv").read_text()


def test_the_picture_is_drawn_for_print_by_a_worker(qtbot, window, tmp_path, starter):
    add_run(window, 1e-5)
    window.redraw()
    window.picture.save_picture(tmp_path / "a.svg")
    job = jobs_of(starter, DRAW)[0]
    from thalweg_app.jobs import draw

    draw(job.payload, lambda event: None, lambda: False)
    text = (tmp_path / "a.svg").read_text()
    assert "Chemical accuracy" in text
    job.listener.done(str(tmp_path / "a.svg"))
    assert "a.svg" in window.status.text


def test_every_control_of_the_column_is_named_and_reachable(qtbot, window):
    from PySide6.QtWidgets import QAbstractButton, QComboBox

    for section in window.column.sections.values():
        section.set_open(True)
    for widget in window.column.findChildren(QLineEdit) + window.column.findChildren(QComboBox) + window.column.findChildren(QAbstractButton):
        if not widget.isVisible() or widget.objectName().startswith("qt_") or widget.metaObject().className() == "QTableCornerButton":
            continue
        assert widget.accessibleName() or widget.text(), widget
        assert widget.focusPolicy() != Qt.FocusPolicy.NoFocus, widget.accessibleName()
        assert widget.toolTip(), widget.accessibleName()


def test_differences_can_be_shown_in_another_unit(qtbot, window):
    add_run(window, 1e-5)
    window.choose_difference_unit("eV")
    assert "Error / eV" in window.workbench.ledger.header
    assert QSettings().value("difference_unit") == "eV"


def test_recent_sessions_are_offered(qtbot, window, tmp_path):
    path = window.workbench.document.save(tmp_path / "lih")
    window.menus._fill_recent()
    assert window.menus._recent.actions()[0].text() == str(path)
