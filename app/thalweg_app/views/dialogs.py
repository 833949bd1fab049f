"""Message boxes and small dialogs. All are opened without blocking, so that work and tests go on."""

from __future__ import annotations

from collections.abc import Callable
from html import escape

from PySide6.QtCore import Qt
from PySide6.QtGui import QFontDatabase
from PySide6.QtWidgets import QComboBox, QDialog, QDialogButtonBox, QHBoxLayout, QLabel, QMessageBox, QPlainTextEdit, QVBoxLayout, QWidget

from thalweg import __version__
from thalweg.errors import StudyError
from thalweg.study.events import Failed
from thalweg_app.forms import describe
from thalweg_app.presenters.fields import choice_words
from thalweg_app.presenters.wording import sentence
from thalweg_app.theme import application_icon

ABOUT = (
    "<b>Thalweg {version}</b><p>Ground-state energy studies of small molecules and spin models with variational quantum circuits.</p>"
    "<p>Energies from this program are not data on safety, stability or toxicity. For everything done with real substances, local rules and "
    "licensed practice come first.</p>"
    "<p>Licence: Apache-2.0. The font Inter is bundled under the SIL Open Font License 1.1. The texts are in the folder of licences.</p>"
)


def show_error(parent: QWidget, error: StudyError) -> QMessageBox:
    """What went wrong in bold, why and how to mend it below."""
    box = _box(parent, QMessageBox.Icon.Warning, error.what, f"{error.why[:1].upper()}{error.why[1:]}.\n\n{error.fix}.")
    box.open()
    return box


def show_defect(parent: QWidget | None, failure: Failed, log: str = "") -> QMessageBox:
    """A defect of the program: told, with details to pass on; the program lives on."""
    below = sentence(failure.what, failure.why, failure.fix)
    where = f" It is kept in {log}." if log else ""
    box = _box(parent, QMessageBox.Icon.Critical, "Something went wrong inside the program", f"{below}\n\nYour session is still here.{where}")
    if failure.details:
        box.setDetailedText(failure.details)
    box.open()
    return box


def show_about(parent: QWidget) -> QMessageBox:
    box = QMessageBox(parent)
    box.setWindowTitle("About Thalweg")
    box.setIconPixmap(application_icon().pixmap(64, 64))
    box.setText(ABOUT.format(version=__version__))
    box.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
    box.open()
    return box


def ask_unsaved(parent: QWidget, name: str, has_results: bool, save: Callable[[], None], discard: Callable[[], None]) -> QMessageBox:
    """Save, discard or cancel."""
    what = "results and changes" if has_results else "changes"
    return _ask(parent, f"Save the {what} in “{name}”?", "Otherwise they are lost.", ("Save", save), ("Do not save", discard), "Cancel")


def ask_under_way(parent: QWidget, work: str, stop: Callable[[], None], leave: Callable[[], None]) -> QMessageBox:
    """Stop and stay, close all the same, or cancel; `work` is `run` or `scan`."""
    kept = "its best point so far" if work == "run" else "what it has finished"
    return _ask(parent, f"A {work} is under way", f"Stopped, {kept} is kept. Closed now, it is lost.", ("Stop", stop), ("Close", leave), "Cancel")


def ask_recovery(parent: QWidget, names: list[str], restore: Callable[[], None], drop: Callable[[], None]) -> QMessageBox:
    """What to do with a session that a crash left behind."""
    below = f"“{names[0]}” was open when the program ended unexpectedly."
    return _ask(parent, "An unsaved session was left behind", below, ("Restore", restore), ("Throw away", drop), "Later")


def _ask(
    parent: QWidget, text: str, below: str, keep: tuple[str, Callable[[], None]], lose: tuple[str, Callable[[], None]], neither: str
) -> QMessageBox:
    """A question with a way that keeps, the default, one that loses, and one that does neither."""
    box = _box(parent, QMessageBox.Icon.Question, text, below)
    keep_button = box.addButton(keep[0], QMessageBox.ButtonRole.AcceptRole)
    lose_button = box.addButton(lose[0], QMessageBox.ButtonRole.DestructiveRole)
    box.addButton(neither, QMessageBox.ButtonRole.RejectRole)
    box.setDefaultButton(keep_button)

    def answered() -> None:
        if box.clickedButton() is keep_button:
            keep[1]()
        elif box.clickedButton() is lose_button:
            lose[1]()

    box.finished.connect(lambda _: answered())
    box.open()
    return box


class PasteDialog(QDialog):
    """Text with atoms; it stays open until it can be read. `take(text, unit)` gives the error, if any."""

    def __init__(self, parent: QWidget, text: str, take: Callable[[str, str], StudyError | None]) -> None:
        super().__init__(parent)
        self._take = take
        self.setWindowTitle("Paste atoms")
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self.resize(520, 360)
        self.text = QPlainTextEdit(text)
        self.text.setPlaceholderText("Li  0.0  0.0  0.0\nH   0.0  0.0  1.6")
        self.text.setFont(QFontDatabase.systemFont(QFontDatabase.SystemFont.FixedFont))
        describe(self.text, "Atoms", "XYZ text, or an element and three coordinates on each line.")
        self.unit = QComboBox()
        for unit in ("angstrom", "bohr"):
            self.unit.addItem(choice_words(unit), unit)
        describe(self.unit, "Unit", "Unit of the coordinates.")
        self._error = QLabel(wordWrap=True)
        self._error.setProperty("role", "error")
        buttons = QDialogButtonBox(QDialogButtonBox.StandardButton.Ok | QDialogButtonBox.StandardButton.Cancel)
        buttons.button(QDialogButtonBox.StandardButton.Ok).setText("Use these atoms")
        buttons.accepted.connect(self.accept)
        buttons.rejected.connect(self.reject)
        label = QLabel("Coordinates in")
        label.setBuddy(self.unit)
        row = QHBoxLayout()
        row.addWidget(label)
        row.addWidget(self.unit)
        row.addStretch(1)
        layout = QVBoxLayout(self)
        layout.addWidget(QLabel("One atom a line: element, x, y, z. XYZ text is read as well."))
        layout.addWidget(self.text, 1)
        layout.addLayout(row)
        layout.addWidget(self._error)
        layout.addWidget(buttons)

    def accept(self) -> None:
        error = self._take(self.text.toPlainText(), str(self.unit.currentData()))
        if error is None:
            super().accept()
        else:
            self._error.setText(str(error))


def _box(parent: QWidget | None, picture: QMessageBox.Icon, text: str, below: str) -> QMessageBox:
    box = QMessageBox(parent)
    box.setIcon(picture)
    box.setWindowTitle("Thalweg")
    box.setText(f"<b>{escape(text)}</b>")
    box.setInformativeText(below)
    box.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
    return box
