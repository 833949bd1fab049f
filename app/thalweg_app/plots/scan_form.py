"""The form of a scan: path, points, and the buttons that start and stop it."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import QSize, QTimer
from PySide6.QtWidgets import QCheckBox, QHBoxLayout, QLabel, QPushButton, QVBoxLayout, QWidget

from thalweg.errors import StudyError
from thalweg.registry import key_of
from thalweg.study.path import PATHS, FramesPath
from thalweg.study.scan_spec import Literature
from thalweg_app.colours import LIGHT, Palette
from thalweg_app.forms import OptionsForm, QuietCombo, TextEntry, describe, form_grid
from thalweg_app.plots.frames_rows import FramesRows
from thalweg_app.presenters.scan_control import SPACINGS, ScanControl
from thalweg_app.presenters.wording import time_left
from thalweg_app.theme import SPACE, icon
from thalweg_app.widgets.fold import Fold
from thalweg_app.widgets.tab_order import visit_after

#: Rest after an edit before the time is estimated.
REST_MS = 600


class ScanForm(QWidget):
    """Shows the draft of `ScanControl`."""

    def __init__(self, scans: ScanControl, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._scans = scans
        self._errors: dict[str, StudyError] = {}
        self._forms: dict[str, OptionsForm] = {}
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(SPACE)
        column.addLayout(self._path_row())
        self._fields = QVBoxLayout()
        column.addLayout(self._fields)
        self.frames = FramesRows(scans)
        self._points = self._points_rows()
        column.addWidget(self.frames)
        column.addWidget(self._points)
        column.addLayout(self._switches())
        self.trouble = QLabel(wordWrap=True)
        self.trouble.setProperty("role", "error")
        self.trouble.setAccessibleName("Why the scan cannot start")
        column.addWidget(self.trouble)
        column.addLayout(self._buttons())
        self._rest = QTimer(self, singleShot=True, interval=REST_MS)
        self._rest.timeout.connect(scans.foresee)
        scans.progressed.connect(self._show_progress)
        self.refresh()

    def refresh(self) -> None:
        draft = self._scans.draft
        key = key_of(type(draft.path))
        self.path.setCurrentIndex(self.path.findData(key))
        is_frames = isinstance(draft.path, FramesPath)
        self.frames.setVisible(is_frames)
        self._points.setVisible(not is_frames)
        if is_frames:
            self.frames.refresh()
        self._show_form(key)
        self.spacing.setCurrentIndex(self.spacing.findData(draft.spacing))
        for name, entry in self._entries.items():
            entry.show_value(getattr(draft, name))
            shown = (name == "values") == (draft.spacing == "list")
            entry.setVisible(shown)
            self._labels[name].setVisible(shown)
        self.both.setChecked(draft.both_directions)
        self.follow.setChecked(draft.follow_orbitals)
        self.fixed.setChecked(draft.fixed_spin)
        self.literature.show_values(lambda dotted: _shown(getattr(draft.literature, dotted.removeprefix("literature."))), self._errors)
        obstacle = self._scans.obstacle
        self.trouble.setText(obstacle)
        self.trouble.setVisible(bool(obstacle))
        running = self._scans.live is not None
        self.start.setEnabled(not obstacle and not running)
        self.stop.setEnabled(running)
        self._show_progress()
        if self.isVisible() and not running and not obstacle:
            self._rest.start()

    def set_palette(self, palette: Palette) -> None:
        self.start.setIcon(icon("run", palette.on_accent, 14, palette.muted))
        self.stop.setIcon(icon("stop", palette.ink, 14))
        self._fold.refresh_icon()

    def _path_row(self) -> QHBoxLayout:
        self.path = QuietCombo()
        for cls in PATHS:
            self.path.addItem(cls.title, key_of(cls))
        describe(self.path, "Path", "What is varied from point to point.")
        self.path.activated.connect(lambda i: self._scans.choose_path(self.path.itemData(i)))
        row = QHBoxLayout()
        label = QLabel("Path")
        label.setProperty("role", "heading")
        label.setBuddy(self.path)
        row.addWidget(label)
        row.addWidget(self.path, 1)
        return row

    def _points_rows(self) -> QWidget:
        holder = QWidget()
        grid = form_grid(holder)
        self.spacing = QuietCombo()
        for key, text in SPACINGS.items():
            self.spacing.addItem(text, key)
        describe(self.spacing, "Spacing of the points", "Equal steps, a constant ratio, or a list of values.")
        self.spacing.activated.connect(lambda i: self._edit("spacing", self.spacing.itemData(i)))
        grid.addWidget(QLabel("Points"), 0, 0)
        grid.addWidget(self.spacing, 0, 1)
        titles = {
            "first": ("From", "First value of the coordinate."),
            "last": ("To", "Last value of the coordinate."),
            "count": ("Number", "How many points, both ends included."),
            "values": ("Values", "Values of the coordinate, separated by spaces or commas."),
        }
        self._entries: dict[str, TextEntry] = {}
        self._labels: dict[str, QLabel] = {}
        for row, (name, (title, about)) in enumerate(titles.items(), 1):
            entry = TextEntry(name != "values")
            describe(entry, title, about)
            entry.committed.connect(lambda text, name=name: self._edit(name, text))
            label = QLabel(title)
            label.setBuddy(entry)
            grid.addWidget(label, row, 0)
            grid.addWidget(entry, row, 1)
            self._entries[name], self._labels[name] = entry, label
        return holder

    def _switches(self) -> QVBoxLayout:
        self.both, self.follow, self.fixed = QCheckBox("From both ends"), QCheckBox("Follow orbitals"), QCheckBox("Keep the spin")
        describe(self.fixed, "Keep the spin", "Holds the exact state at the multiplicity asked for, also where another spin lies lower.")
        self.fixed.clicked.connect(lambda on: self._edit("fixed_spin", bool(on)))
        describe(self.both, "From both ends", "Runs the curve in both directions and keeps the lower energy at each point.")
        describe(self.follow, "Follow orbitals", "Chooses the active orbitals of a point by their overlap with its neighbour's.")
        self.both.clicked.connect(lambda on: self._edit("both_directions", bool(on)))
        self.follow.clicked.connect(lambda on: self._edit("follow_orbitals", bool(on)))
        column = QVBoxLayout()
        column.addWidget(self.follow)
        column.addWidget(self.both)
        column.addWidget(self.fixed)
        self.literature = OptionsForm(Literature, "literature")
        self.literature.edited.connect(self._edit_within)
        fold = Fold("Values from the literature")
        fold.set_content(self.literature)
        column.addWidget(fold)
        self._fold = fold
        return column

    def _buttons(self) -> QHBoxLayout:
        self.start, self.stop = QPushButton("Scan"), QPushButton("Stop scan")
        self.start.setProperty("role", "primary")
        describe(self.start, "Scan", "Runs every point of the path (Ctrl+Alt+R).")
        describe(self.stop, "Stop scan", "Ends the scan and keeps the points that are finished.")
        for button in (self.start, self.stop):
            button.setIconSize(QSize(14, 14))
        self.start.clicked.connect(self._scans.start)
        self.stop.clicked.connect(self._scans.stop)
        self.progress = QLabel()
        self.progress.setProperty("role", "muted")
        row = QHBoxLayout()
        row.addWidget(self.start, 1)
        row.addWidget(self.stop)
        outer = QVBoxLayout()
        outer.addLayout(row)
        outer.addWidget(self.progress)
        holder = QHBoxLayout()
        holder.addLayout(outer)
        self.set_palette(LIGHT)
        return holder

    def _show_form(self, key: str) -> None:
        for name, other in self._forms.items():
            other.setVisible(name == key)
        if isinstance(self._scans.draft.path, FramesPath):
            return
        if key not in self._forms:
            form = OptionsForm(type(self._scans.draft.path), "path")
            form.edited.connect(self._edit_within)
            self._forms[key] = form
            self._fields.addWidget(form)
            visit_after(self.path, form)
        path = self._scans.draft.path
        self._forms[key].show_values(lambda dotted: getattr(path, dotted.removeprefix("path.")), self._errors)

    def _edit(self, name: str, value: Any) -> None:
        self._scans.edit(name, value)

    def _edit_within(self, dotted: str, value: Any) -> None:
        error = self._scans.edit(dotted, value)
        self._errors = {} if error is None else {dotted: error}
        self.refresh()

    def _show_progress(self) -> None:
        live = self._scans.live
        if live is None:
            ahead = self._scans.seconds_ahead
            self.progress.setText("" if ahead is None else time_left(ahead).replace(" left", " to run"))
            return
        left = live.seconds_left
        self.progress.setText(live.text + ("" if left is None else f", {time_left(left)}"))


def _shown(value: Any) -> Any:
    """What a field shows: nothing where no value is given."""
    return "" if value is None else value
