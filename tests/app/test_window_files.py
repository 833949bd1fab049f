"""Opening, saving, dropping, closing and recovery in the window, with jobs answered by hand."""

import studies
import windows
from PySide6.QtCore import QMimeData, QPointF, Qt, QUrl
from PySide6.QtGui import QDropEvent, QGuiApplication
from PySide6.QtWidgets import QFileDialog, QLineEdit, QMessageBox
from windows import add_run, jobs_of, press

from thalweg.storage.session import SUFFIX, load_session
from thalweg.systems.samples import list_samples
from thalweg_app.main import begin
from thalweg_app.presenters.jobs import OPEN_FILE
from thalweg_app.views.dialogs import PasteDialog


def test_saving_asks_for_a_name_once_and_clears_the_mark(qtbot, window, tmp_path):
    add_run(window, 1e-5)
    press(window, Qt.Key.Key_S)
    dialog = windows.dialog(window, QFileDialog)
    dialog.findChild(QLineEdit).setText(str(tmp_path / "lih"))
    dialog.accept()
    assert load_session(tmp_path / f"lih{SUFFIX}").runs == window.workbench.ledger.runs
    assert not window.isWindowModified()
    assert window.windowTitle().startswith("lih")
    window.workbench.ledger.annotate(1, "again")
    press(window, Qt.Key.Key_S)
    assert load_session(tmp_path / f"lih{SUFFIX}").runs[0].note == "again"


def test_a_save_that_fails_is_told_and_nothing_is_lost(qtbot, window, tmp_path):
    add_run(window, 1e-5)
    window.files._save_to(tmp_path / "missing" / "x", lambda: None)
    assert windows.dialog(window, QMessageBox) is not None
    assert window.isWindowModified()


def test_opening_a_session_shows_what_was_saved(qtbot, window, tmp_path):
    add_run(window, 3e-3, 1e-5)
    path = window.workbench.document.save(tmp_path / "lih")
    window.files.new_session()
    assert window.ledger_view.model.rowCount() == 0
    window.open_path(str(path))
    assert window.ledger_view.model.rowCount() == 2
    assert "0.01 mEh" in window.column.answer.text


def test_opening_over_unsaved_results_asks_first(qtbot, window, tmp_path):
    path = window.workbench.document.save(tmp_path / "lih")
    add_run(window, 1e-5)
    window.open_path(str(path))
    box = windows.dialog(window, QMessageBox)
    box.button(QMessageBox.StandardButton.NoButton)
    next(b for b in box.buttons() if b.text() == "Cancel").click()
    assert window.ledger_view.model.rowCount() == 1


def test_every_sample_opens(qtbot, window):
    for sample in list_samples():
        window.column.system.sample_asked.emit(str(sample.file))
        assert windows.dialog(window, QMessageBox) is None, sample.name
        assert not window.workbench.setup.errors
        assert sample.name in window.workbench.history.undo_text


def test_a_file_that_cannot_be_read_is_told(qtbot, window, tmp_path):
    window.open_path(str(tmp_path / "missing.xyz"))
    assert "missing.xyz" in windows.dialog(window, QMessageBox).text()


def test_a_large_file_is_read_by_a_worker(qtbot, window, tmp_path, starter):
    path = tmp_path / "large.xyz"
    path.write_text("2\n\nH 0 0 0\nH 0 0 0.74\n" + "\n" * 400_000)
    window.open_path(str(path))
    job = jobs_of(starter, OPEN_FILE)[0]
    job.listener.done({"system": studies.molecule(name="large").model_dump(mode="json"), "notes": ["Read."]})
    assert window.workbench.setup.spec.system.name == "large"


def test_a_dropped_geometry_becomes_the_system(qtbot, window):
    sample = next(s for s in list_samples() if s.name == "H2O")
    data = QMimeData()
    data.setUrls([QUrl.fromLocalFile(str(sample.file))])
    assert window.files.can_drop(data)
    drop = QDropEvent(QPointF(50, 50), Qt.DropAction.CopyAction, data, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier)
    window.dropEvent(drop)
    assert window.workbench.setup.spec.system.name == "H2O"


def test_pasted_atoms_are_read_and_bad_ones_leave_the_dialog_open(qtbot, window):
    QGuiApplication.clipboard().setText("He 0 0 0\nH 0 0 nonsense")
    window.files.ask_paste()
    dialog = windows.dialog(window, PasteDialog)
    dialog.accept()
    assert dialog.isVisible()
    assert dialog._error.text()
    dialog.text.setPlainText("He 0 0 0\nH 0 0 1.5")
    dialog.unit.setCurrentIndex(1)
    dialog.accept()
    assert window.workbench.setup.spec.system.atoms == (("He", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 1.5))
    assert window.workbench.setup.spec.system.unit == "bohr"


def test_closing_with_unsaved_results_asks(qtbot, window):
    window._may_close = False
    add_run(window, 1e-5)
    assert not window.close()
    box = windows.dialog(window, QMessageBox)
    next(b for b in box.buttons() if b.text() == "Cancel").click()
    assert window.isVisible()
    window.close()
    next(b for b in windows.dialog(window, QMessageBox).buttons() if b.text() == "Do not save").click()
    assert not window.isVisible()


def test_closing_saves_when_asked_to(qtbot, window, tmp_path):
    window._may_close = False
    window.workbench.document.save(tmp_path / "lih")
    add_run(window, 1e-5)
    window.close()
    next(b for b in windows.dialog(window, QMessageBox).buttons() if b.text() == "Save").click()
    assert not window.isVisible()
    assert len(load_session(tmp_path / f"lih{SUFFIX}").runs) == 1


def test_closing_while_a_run_is_under_way_asks_before_it_is_lost(qtbot, window, starter):
    def answer(text):
        window.close()
        next(b for b in windows.dialog(window, QMessageBox).buttons() if b.text() == text).click()

    window._may_close = False
    window.run()
    assert not window.workbench.document.is_dirty
    answer("Cancel")
    assert window.isVisible()
    assert not starter.last.was_stopped
    answer("Stop")
    assert window.isVisible()
    assert starter.last.was_stopped
    answer("Close")
    assert not window.isVisible()


def test_a_clean_window_closes_at_once(qtbot, window):
    window._may_close = False
    assert window.close()


def test_place_and_split_are_remembered(qtbot, window, tmp_path):
    window.whole.setSizes([450, 550])
    column, width = window.column.width(), window.width()
    window.close()
    again = windows.make(qtbot, tmp_path)
    assert again.width() == width
    assert again.column.width() == column


def test_a_crash_is_recovered_at_the_next_start(qtbot, window, tmp_path):
    from thalweg_app.presenters.document import Recovery

    add_run(window, 1e-5)
    Recovery(tmp_path / "recovery", process=999_999_999).keep(window.workbench.document)
    fresh = windows.make(qtbot, tmp_path)
    begin(fresh, [])
    next(b for b in windows.dialog(fresh, QMessageBox).buttons() if b.text() == "Restore").click()
    assert fresh.ledger_view.model.rowCount() == 1
    assert fresh.isWindowModified()
