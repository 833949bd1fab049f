"""Diagnosis: why a search fails, as curve, map and figures."""

from __future__ import annotations

from typing import Any, ClassVar

from PySide6.QtCore import QSize, Qt
from PySide6.QtWidgets import QHBoxLayout, QLabel, QPushButton, QSplitter, QStackedWidget, QVBoxLayout, QWidget

from thalweg.study.diagnosis_result import LandscapeResult, TrainabilityResult
from thalweg_app.colours import Palette
from thalweg_app.forms import QuietCombo, TextEntry, describe, form_grid
from thalweg_app.plots.map_view import MapView
from thalweg_app.plots.picture import Picture
from thalweg_app.presenters.chart import Chart
from thalweg_app.presenters.diagnosis import Finding, chart_of, table_of_finding
from thalweg_app.presenters.diagnosis_control import COSTS, DIRECTIONS, QUESTIONS
from thalweg_app.presenters.tables import Table
from thalweg_app.presenters.wording import typeset
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.theme import icon
from thalweg_app.widgets.number_table import NumberTable
from thalweg_app.widgets.scrolled import scrolled_column

SIDE_WIDTH = 330

EMPTY = Chart("Diagnosis", "", (), "Ask why a search fails: choose a question and press Diagnose.")
_ASKS: dict[str, tuple[str, ...]] = {
    "trainability": ("cost", "sizes", "layers", "samples"),
    "landscape": ("first", "first_parameter", "second", "second_parameter", "reach", "points"),
    "curvature": (),
    "starts": (),
}
_FIELDS: dict[str, tuple[str, str]] = {
    "cost": ("Cost", "What is differentiated: the energy, or the probability of |0...0> (global) or of 0 on a qubit (local)."),
    "sizes": ("Sizes", "Sites of the lattice, or qubits of a global or local cost, such as 2, 4, 6-8; empty: as the study is."),
    "layers": ("Layers", "Depths of the trial state, such as 1-4; empty: as it is set."),
    "samples": ("Samples", "Random starts of each point."),
    "first": ("Direction", "Along what the energy is followed."),
    "first_parameter": ("Parameter", "Number of the parameter, from 0, where the direction is one parameter."),
    "second": ("Second direction", "A second direction makes a map."),
    "second_parameter": ("Parameter", "Number of the second direction's parameter, from 0."),
    "reach": ("Reach / rad", "How far to go on both sides."),
    "points": ("Points", "Energies along each direction."),
}
_CHOICES = {"cost": COSTS, "first": {k: v for k, v in DIRECTIONS.items() if k != "none"}, "second": DIRECTIONS}


class DiagnosisPicture(Picture):
    title: ClassVar[str] = "Diagnosis"
    about: ClassVar[str] = "Why a search fails: vanishing gradients, the landscape, the curvature at the found point."

    def __init__(self, workbench: Workbench, parent: QWidget | None = None) -> None:
        super().__init__(workbench, parent)
        self.control = workbench.diagnosis
        self.map = MapView()
        self.stack = QStackedWidget()
        self.stack.addWidget(self.view)
        self.stack.addWidget(self.map)
        split = QSplitter(Qt.Orientation.Horizontal, self)
        split.setChildrenCollapsible(False)
        self.body.addWidget(split, 1)
        split.addWidget(self.stack)
        self._fill(scrolled_column(split, SIDE_WIDTH))
        split.setStretchFactor(0, 1)
        split.setSizes([640, SIDE_WIDTH])
        self.control.changed.connect(self.refresh_shown)
        self.control.progressed.connect(self._show_progress)

    def refresh(self) -> None:
        draft = self.control.draft
        self.what.setCurrentIndex(self.what.findData(draft.what))
        self.about_what.setText(QUESTIONS[draft.what][1])
        for name, (label, editor) in self._fields.items():
            shown = name in _ASKS[draft.what] and self._fits(name)
            label.setVisible(shown)
            editor.setVisible(shown)
            if isinstance(editor, TextEntry):
                editor.show_value(getattr(draft, name))
            elif isinstance(editor, QuietCombo):
                editor.setCurrentIndex(max(0, editor.findData(getattr(draft, name))))
        obstacle = self.control.obstacle
        self.trouble.setText(obstacle)
        self.trouble.setVisible(bool(obstacle))
        self.start.setEnabled(not obstacle and not self.control.is_running)
        self.stop.setEnabled(self.control.is_running)
        self._show_found(self.control.found)
        self._show_progress()

    def set_palette(self, palette: Palette) -> None:
        super().set_palette(palette)
        self.map.set_palette(palette)
        self.start.setIcon(icon("run", palette.on_accent, 14, palette.muted))
        self.stop.setIcon(icon("stop", palette.ink, 14))

    def numbers(self) -> tuple[list[str], list[list[object]]]:
        found = self.control.found
        return ["figure", "value"], [] if found is None else [list(row) for row in table_of_finding(found)]

    def _fits(self, name: str) -> bool:
        draft = self.control.draft
        kind = {"first_parameter": draft.first, "second_parameter": draft.second}.get(name)
        return kind is None or kind == "parameter"

    def _show_found(self, found: Finding | None) -> None:
        is_map = isinstance(found, LandscapeResult) and len(found.steps) == 2
        self.stack.setCurrentIndex(int(is_map))
        if is_map:
            assert isinstance(found, LandscapeResult)
            self.map.show_map(found)
        else:
            drawn = isinstance(found, TrainabilityResult | LandscapeResult)
            self.view.show_chart(chart_of(found) if found is not None and drawn else EMPTY)
        sentence = "" if found is None else typeset(found.verdict[:1].upper() + found.verdict[1:] + ".")
        self.sentence.setText(sentence)
        rows = () if found is None else tuple((name, typeset(text)) for name, text in table_of_finding(found))
        keys: tuple[tuple[float | str, ...], ...] = tuple((float(i), float(i)) for i in range(len(rows)))
        self.table.show_table(Table(("Figure", "Value"), rows, (False, False), keys, "What the diagnosis found."))
        self.table.setVisible(bool(rows))
        self.table.setColumnWidth(0, 118)

    def _show_progress(self) -> None:
        self.progress.setText(self.control.stage if self.control.is_running else "")

    def _fill(self, column: QVBoxLayout) -> None:
        self.what = QuietCombo()
        for key, (title, _) in QUESTIONS.items():
            self.what.addItem(title, key)
        describe(self.what, "Question", "What is to be found out.")
        self.what.activated.connect(lambda i: self.control.edit("what", self.what.itemData(i)))
        self.about_what, self.trouble, self.sentence, self.progress = (QLabel(wordWrap=True) for _ in range(4))
        for label, role in ((self.about_what, "muted"), (self.trouble, "error"), (self.sentence, "heading"), (self.progress, "muted")):
            label.setProperty("role", role)
        self.sentence.setAccessibleName("Verdict of the diagnosis")
        self.sentence.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self.table = NumberTable("What the diagnosis found")
        self.table.setSortingEnabled(False)
        self.table.horizontalHeader().setStretchLastSection(True)
        for part in (self.what, self.about_what, self._form(column.parentWidget()), self.trouble, self._buttons(), self.progress, self.sentence):
            column.addWidget(part)
        self.table.setMinimumHeight(150)
        column.addWidget(self.table, 1)
        column.addStretch(1)

    def _form(self, parent: QWidget | None) -> QWidget:
        holder = QWidget(parent)
        grid = form_grid(holder)
        self._fields: dict[str, tuple[QLabel, QWidget]] = {}
        for row, (name, (title, help)) in enumerate(_FIELDS.items()):
            editor = self._editor(name)
            describe(editor, title, help)
            label = QLabel(title)
            label.setBuddy(editor)
            grid.addWidget(label, row, 0)
            grid.addWidget(editor, row, 1)
            self._fields[name] = (label, editor)
        return holder

    def _editor(self, name: str) -> Any:
        if name not in _CHOICES:
            entry = TextEntry(name not in ("sizes", "layers"))
            entry.committed.connect(lambda text, name=name: self.control.edit(name, text))
            return entry
        combo = QuietCombo()
        for key, title in _CHOICES[name].items():
            combo.addItem(title, key)
        combo.activated.connect(lambda i, name=name, combo=combo: self.control.edit(name, combo.itemData(i)))
        return combo

    def _buttons(self) -> QWidget:
        self.start, self.stop = QPushButton("Diagnose"), QPushButton("Stop diagnosis")
        self.start.setProperty("role", "primary")
        describe(self.start, "Diagnose", "Works out what the question asks.")
        describe(self.stop, "Stop diagnosis", "Ends the diagnosis.")
        for button in (self.start, self.stop):
            button.setIconSize(QSize(14, 14))
        self.start.clicked.connect(self.control.start)
        self.stop.clicked.connect(self.control.stop)
        holder = QWidget()
        row = QHBoxLayout(holder)
        row.setContentsMargins(0, 0, 0, 0)
        row.addWidget(self.start, 1)
        row.addWidget(self.stop)
        return holder
