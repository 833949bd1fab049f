"""Turns the metadata of a settings class into input widgets. What is typed goes out as it is; reading it is the presenter's work."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from pydantic import BaseModel
from PySide6.QtCore import QEvent, Qt, Signal
from PySide6.QtGui import QKeySequence
from PySide6.QtWidgets import QCheckBox, QComboBox, QGridLayout, QHBoxLayout, QLabel, QLineEdit, QSizePolicy, QWidget

from thalweg.errors import StudyError
from thalweg_app.presenters.fields import FieldFacts, choice_words, fields_of, help_text
from thalweg_app.presenters.numbers import number_text
from thalweg_app.presenters.wording import unit_name
from thalweg_app.theme import mark
from thalweg_app.widgets.fold import Fold

LABEL_WIDTH = 104


class TextEntry(QLineEdit):
    """A line whose text is committed by Return or by leaving it; Escape brings the last text back."""

    committed = Signal(str)

    def __init__(self, numeric: bool) -> None:
        super().__init__()
        self._shown = ""
        if numeric:
            self.setAlignment(Qt.AlignmentFlag.AlignRight)
        self.editingFinished.connect(self.commit)

    def show_value(self, value: Any) -> None:
        text = value if isinstance(value, str) else number_text(value)
        if text != self._shown or not self.hasFocus():
            self._shown = text
            if self.text() != text:
                self.setText(text)

    def commit(self) -> None:
        """Hands over what was typed, if it is new."""
        if self.text() != self._shown:
            self._shown = self.text()
            self.committed.emit(self.text())

    def event(self, event: Any) -> bool:
        """Undo, redo and Escape are the field's own only while something in it is not committed yet."""
        if event.type() == QEvent.Type.ShortcutOverride:
            pending = self.text() != self._shown
            if event.key() == Qt.Key.Key_Escape:
                event.setAccepted(pending)
                return pending
            if not pending and (event.matches(QKeySequence.StandardKey.Undo) or event.matches(QKeySequence.StandardKey.Redo)):
                event.ignore()
                return False
        return super().event(event)

    def keyPressEvent(self, event: Any) -> None:  # noqa: N802 - Qt's name
        if event.key() == Qt.Key.Key_Escape and self.text() != self._shown:
            self.setText(self._shown)
            return
        super().keyPressEvent(event)


class QuietCombo(QComboBox):
    """A combo box that the mouse wheel scrolls past instead of changing a setting unawares."""

    def wheelEvent(self, event: Any) -> None:  # noqa: N802
        event.ignore()


class FieldRow:
    """Label, editor, unit, and a line for the error under them."""

    def __init__(self, facts: FieldFacts, path: str, edited: Callable[[str, Any], None]) -> None:
        self.facts, self.path, self._edited = facts, path, edited
        self.label = QLabel(facts.title)
        self.label.setWordWrap(True)
        self.error = QLabel()
        self.error.setProperty("role", "error")
        self.error.setWordWrap(True)
        self.error.hide()
        self.editor, self._show = self._make()
        self.editor.setProperty("bad", False)
        describe(self.editor, facts.title, help_text(facts))
        self.label.setToolTip(self.editor.toolTip())
        if isinstance(self.editor, QWidget):
            self.label.setBuddy(self.editor)

    def show(self, value: Any, error: StudyError | None) -> None:
        self._show(value)
        self.error.setVisible(error is not None)
        self.error.setText(str(error) if error else "")
        mark(self.editor, "bad", error is not None)
        self.editor.setAccessibleDescription(f"{help_text(self.facts)} {error or ''}".strip())

    def _make(self) -> tuple[QWidget, Callable[[Any], None]]:
        makers = {"switch": self._switch, "choice": self._choice, "choices": self._choices}
        return makers.get(self.facts.kind, self._entry)()

    def _entry(self) -> tuple[QWidget, Callable[[Any], None]]:
        entry = TextEntry(self.facts.kind in ("number", "whole"))
        entry.committed.connect(lambda text: self._edited(self.path, text))
        return entry, entry.show_value

    def _switch(self) -> tuple[QWidget, Callable[[Any], None]]:
        box = QCheckBox(self.facts.title)
        box.clicked.connect(lambda on: self._edited(self.path, bool(on)))
        return box, lambda value: box.setChecked(bool(value))

    def _choice(self) -> tuple[QWidget, Callable[[Any], None]]:
        combo = QuietCombo()
        combo.setMinimumContentsLength(8)
        combo.setSizeAdjustPolicy(QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon)
        for key in self.facts.choices:
            combo.addItem(choice_words(key), key)
        combo.activated.connect(lambda i: self._edited(self.path, combo.itemData(i)))
        return combo, lambda value: combo.setCurrentIndex(max(0, combo.findData(value)))

    def _choices(self) -> tuple[QWidget, Callable[[Any], None]]:
        holder = QWidget()
        row = QHBoxLayout(holder)
        row.setContentsMargins(0, 0, 0, 0)
        boxes = {key: QCheckBox(choice_words(key)) for key in self.facts.choices}

        def send() -> None:
            self._edited(self.path, tuple(key for key, box in boxes.items() if box.isChecked()))

        def show(value: Any) -> None:
            for key, box in boxes.items():
                box.setChecked(key in value)

        for key, box in boxes.items():
            box.clicked.connect(send)
            describe(box, choice_words(key), self.facts.help)
            row.addWidget(box)
        row.addStretch(1)
        holder.setFocusProxy(next(iter(boxes.values())))
        return holder, show


class OptionsForm(QWidget):
    """All fields of one settings class; advanced ones behind a fold. `edited` carries the dotted path and what was typed."""

    edited = Signal(str, object)

    def __init__(
        self, options: type[BaseModel], prefix: str = "", *, only: tuple[str, ...] = (), skip: tuple[str, ...] = (), fold: str = "More settings"
    ) -> None:
        super().__init__()
        self.options = options
        wanted = [f for f in fields_of(options) if (not only or f.name in only) and f.name not in skip]
        self.rows = [FieldRow(f, f"{prefix}.{f.name}" if prefix else f.name, self.edited.emit) for f in wanted]
        plain = [r for r in self.rows if not r.facts.advanced]
        advanced = [r for r in self.rows if r.facts.advanced]
        layout = form_grid(self)
        add_rows(layout, plain)
        self.fold: Fold | None = None
        if advanced:
            self.fold = Fold(fold)
            inner = QWidget()
            add_rows(form_grid(inner), advanced)
            self.fold.set_content(inner)
            layout.addWidget(self.fold, layout.rowCount(), 0, 1, 3)

    def show_values(self, shown: Callable[[str], Any], errors: Mapping[str, StudyError]) -> None:
        for row in self.rows:
            error = errors.get(row.path)
            row.show(shown(row.path), error)
            if error is not None and row.facts.advanced and self.fold is not None:
                self.fold.set_open(True)

    def editor(self, path: str) -> QWidget:
        """The editor of the field at a dotted path."""
        return next(row.editor for row in self.rows if row.path == path)


def form_grid(parent: QWidget) -> QGridLayout:
    """Three columns: label, editor, unit; the same widths in every form, so that all forms are aligned."""
    grid = QGridLayout(parent)
    grid.setContentsMargins(0, 0, 0, 0)
    grid.setHorizontalSpacing(8)
    grid.setVerticalSpacing(6)
    grid.setColumnMinimumWidth(0, LABEL_WIDTH)
    grid.setColumnStretch(1, 1)
    return grid


def add_rows(grid: QGridLayout, rows: list[FieldRow]) -> None:
    for row in rows:
        at = grid.rowCount()
        if row.facts.kind == "switch":
            grid.addWidget(row.editor, at, 1, 1, 2)
        else:
            row.editor.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
            row.label.setFixedWidth(LABEL_WIDTH)  # long titles wrap, so that all forms stay aligned
            grid.addWidget(row.label, at, 0)
            unit = unit_name(row.facts.unit)
            grid.addWidget(row.editor, at, 1, 1, 1 if unit else 2)
            if unit:
                label = QLabel(unit)
                label.setProperty("role", "muted")
                grid.addWidget(label, at, 2)
        grid.addWidget(row.error, at + 1, 1, 1, 2)


def describe(widget: QWidget, name: str, help: str) -> None:
    """Tool tip, accessible name and the text that F1 shows."""
    widget.setAccessibleName(name)
    widget.setAccessibleDescription(help)
    widget.setToolTip(f"<p>{help}</p>" if len(help) > 60 else help)
    widget.setProperty("help", f"<b>{name}</b><br>{help}")
