"""Opening, saving, dropping and closing: the dialogs around the document."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from PySide6.QtCore import QMimeData, QSettings, Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import QFileDialog, QMainWindow

from thalweg.errors import StudyError
from thalweg.storage.session import SUFFIX, Session
from thalweg.study.events import Failed
from thalweg_app.presenters.document import Recovery
from thalweg_app.presenters.opening import Opening
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.views.dialogs import PasteDialog, ask_recovery, ask_under_way, ask_unsaved, show_defect, show_error

OPEN_FILTER = "All that can be read (*.thalweg.json *.json *.xyz *.txt *.fcidump FCIDUMP *.hdf5 *.h5);;Every file (*)"
SAVE_FILTER = f"Session (*{SUFFIX})"


class StoredRecent:
    """The list of recent sessions in the person's settings."""

    def read(self) -> list[str]:
        stored = QSettings().value("recent")
        if isinstance(stored, str):  # a list of one is stored as its only member
            return [stored]
        return [str(path) for path in stored] if isinstance(stored, list) else []

    def write(self, paths: list[str]) -> None:
        QSettings().setValue("recent", paths)


class Files:
    """Speaks for the window where files are concerned."""

    def __init__(self, window: QMainWindow, workbench: Workbench, recovery: Recovery) -> None:
        self._window, self._workbench, self._recovery = window, workbench, recovery
        self._opening = Opening(workbench, self._show_error, self._show_defect, self._take_session)

    def ask_open(self) -> None:
        dialog = self._dialog("Open a session, a geometry or integrals", QFileDialog.AcceptMode.AcceptOpen, OPEN_FILTER)
        dialog.setFileMode(QFileDialog.FileMode.ExistingFile)
        dialog.fileSelected.connect(lambda path: self.open(Path(path)))
        dialog.open()

    def open(self, path: Path) -> None:
        self._opening.open(path)

    def open_sample(self, path: str) -> None:
        self._opening.open(Path(path))

    def ask_paste(self) -> None:
        text = QGuiApplication.clipboard().text()
        PasteDialog(self._window, text if len(text) < 100_000 else "", self._opening.paste).open()

    def save(self, then: Callable[[], None] = lambda: None) -> None:
        """Saves to the session's file, or asks for one."""
        path = self._workbench.document.path
        if path is None:
            self.ask_save(then)
        else:
            self._save_to(path, then)

    def ask_save(self, then: Callable[[], None] = lambda: None) -> None:
        dialog = self._dialog("Save the session", QFileDialog.AcceptMode.AcceptSave, SAVE_FILTER)
        dialog.setDefaultSuffix(SUFFIX.lstrip("."))
        document = self._workbench.document
        dialog.selectFile(document.path.name if document.path else f"{self._suggested_name()}{SUFFIX}")
        dialog.fileSelected.connect(lambda chosen: self._save_to(Path(chosen), then))
        dialog.open()

    def new_session(self) -> None:
        self._after_question(self._workbench.document.start_new)

    def close(self, go: Callable[[], None]) -> bool:
        """True when the window may close at once; otherwise a question is shown and `go` called when it is answered."""
        bench = self._workbench
        if bench.under_way:
            ask_under_way(self._window, bench.under_way, bench.stop_all, lambda: self._after_question(go))
            return False
        if not bench.document.is_dirty:
            return True
        self._after_question(go)
        return False

    def offer_recovery(self) -> None:
        """Shows what crashes left behind, one at a time."""
        found = [(path, session) for path in self._recovery.left_behind() if (session := self._recovery.read(path)) is not None]
        if not found:
            return
        path, session = found[0]

        def restore() -> None:
            self._workbench.document.restore(session)
            path.unlink(missing_ok=True)

        ask_recovery(self._window, [session.name or "untitled"], restore, lambda: path.unlink(missing_ok=True))

    def can_drop(self, data: QMimeData) -> bool:
        return any(url.isLocalFile() for url in data.urls()) or (data.hasText() and not data.hasUrls())

    def drop(self, data: QMimeData) -> None:
        """Opens the first file, or reads dropped text as atoms."""
        paths = [url.toLocalFile() for url in data.urls() if url.isLocalFile()]
        if paths:
            self.open(Path(paths[0]))
        elif data.hasText() and (error := self._opening.paste(data.text(), "angstrom")) is not None:
            self._show_error(error)

    def _take_session(self, session: Session, path: Path) -> None:
        def take() -> None:
            self._workbench.document.take(session, path)
            self._workbench.told(f"Opened {path.name}.")

        self._after_question(take)

    def _after_question(self, act: Callable[[], None]) -> None:
        document = self._workbench.document
        if document.is_dirty:
            ask_unsaved(self._window, document.name, document.has_unsaved_results, lambda: self.save(act), act)
        else:
            act()

    def _save_to(self, path: Path, then: Callable[[], None]) -> None:
        try:
            saved = self._workbench.document.save(path)
        except StudyError as error:
            self._show_error(error)
            return
        self._recovery.drop()
        self._workbench.told(f"Saved as {saved}.")
        then()

    def _suggested_name(self) -> str:
        document = self._workbench.document
        name = getattr(self._workbench.setup.spec.system, "name", "")
        return name or document.name

    def _show_defect(self, failure: Failed) -> None:
        show_defect(self._window, failure)

    def _show_error(self, error: StudyError) -> None:
        show_error(self._window, error)

    def _dialog(self, title: str, mode: QFileDialog.AcceptMode, filters: str) -> QFileDialog:
        dialog = QFileDialog(self._window, title)
        dialog.setAcceptMode(mode)
        dialog.setNameFilters(filters.split(";;"))
        dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        folder = str(QSettings().value("folder", ""))
        if folder and Path(folder).is_dir():
            dialog.setDirectory(folder)
        dialog.fileSelected.connect(lambda path: QSettings().setValue("folder", str(Path(path).parent)))
        return dialog
