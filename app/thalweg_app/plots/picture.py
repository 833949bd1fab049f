"""The frame of every picture: its own controls at the left, the shared tools at the right, the read-out under it."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from itertools import pairwise
from pathlib import Path
from typing import ClassVar

from PySide6.QtCore import QSize, Qt
from PySide6.QtGui import QGuiApplication, QPixmap
from PySide6.QtWidgets import QCheckBox, QFileDialog, QHBoxLayout, QLabel, QSizePolicy, QToolButton, QVBoxLayout, QWidget

from thalweg.errors import StudyError
from thalweg.storage.files import write_atomically
from thalweg_app.colours import LIGHT, Palette
from thalweg_app.forms import describe
from thalweg_app.plots.chart_view import ChartView
from thalweg_app.presenters.chart import chart_data, csv_of, table_of
from thalweg_app.presenters.jobs import DRAW, JobListener
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.theme import SPACE, icon
from thalweg_app.widgets.tab_order import visit_after, visited

PICTURE_FILTER = "PNG picture (*.png);;SVG drawing (*.svg);;PDF document (*.pdf)"


class Picture(QWidget):
    """Base of the tabs. A subclass puts widgets into `controls` and `body`, and draws in `refresh`."""

    title: ClassVar[str] = ""
    about: ClassVar[str] = ""

    def __init__(self, workbench: Workbench, parent: QWidget | None = None) -> None:
        """A parent spares work: a widget that moves into another is styled again with all that is in it."""
        super().__init__(parent)
        self.workbench = workbench
        self.palette_now = LIGHT
        self.view = ChartView(self.title)
        self.controls = QHBoxLayout()
        self.controls.setSpacing(6)
        self.body = QVBoxLayout()
        self.body.setContentsMargins(0, 0, 0, 0)
        self._read_out = QLabel()
        self._read_out.setProperty("role", "muted")
        self._read_out.setTextFormat(Qt.TextFormat.PlainText)
        self._read_out.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Fixed)  # a long text must not widen the window
        self._read_out.setFixedHeight(self.fontMetrics().height() + 4)
        self.view.read_out.connect(self._read_out.setText)
        self._tools: list[tuple[QToolButton, str]] = []
        layout = QVBoxLayout(self)
        layout.setContentsMargins(12, SPACE, 12, 4)
        layout.setSpacing(4)
        layout.addLayout(self._head())
        layout.addLayout(self.body, 1)
        layout.addWidget(self._read_out)

    def order_focus(self) -> None:
        """Lets the Tab key visit the picture's own controls, the tools and the chart as they stand, whenever each was made."""
        items = (self.controls.itemAt(i) for i in range(self.controls.count()))
        own = [widget for item in items if item is not None and (widget := item.widget()) is not None]
        row = [*own, *(button for button, _ in self._tools), self.view]
        for before, late in pairwise([widget for widget in row if visited(widget)]):
            visit_after(before, late)

    @property
    def charts(self) -> list[ChartView]:
        """Every chart of the picture, the one that the tools save first."""
        return [self.view]

    def refresh(self) -> None:
        """Draws the present state."""
        raise AssertionError(f"{type(self).__name__} draws nothing")

    def prepare(self) -> Iterator[None]:
        """Builds ahead, a little at each step, what the first drawing would take long for."""
        yield from ()

    def refresh_whole(self) -> None:
        """Draws the present state and shows all of it."""
        self.refresh()
        self.view.fit()

    def fit(self) -> None:
        for chart in self.charts:
            chart.fit()

    def refresh_shown(self) -> None:
        """As `refresh` while the picture is in sight; it is drawn anew whenever it comes into sight."""
        if self.isVisible():
            self.refresh()

    def refresh_live(self) -> None:
        """Draws what a run under way has told; pictures that show only results have nothing to do."""

    def set_palette(self, palette: Palette) -> None:
        self.palette_now = palette
        for chart in self.charts:
            chart.set_palette(palette)
        for button, name in self._tools:
            button.setIcon(icon(name, palette.ink, 16))

    def numbers(self) -> tuple[list[str], list[list[object]]]:
        """Header and rows of the CSV file."""
        return table_of(self.view.chart)

    def image(self) -> QPixmap:
        return self.view.grab()

    def copy_image(self) -> None:
        QGuiApplication.clipboard().setPixmap(self.image())
        self.workbench.told(f"{self.title}: copied as an image.")

    def save_picture(self, path: Path) -> None:
        """Draws the picture for print, in a worker process."""
        data = {"chart": chart_data(self.view.chart), "path": str(path)}
        told = self.workbench.told
        listener = JobListener(
            done=lambda value: told(f"Picture saved as {value}."),
            failed=lambda failure: (
                self.workbench.defect(failure) if failure.details else told(str(StudyError(failure.what, failure.why, failure.fix)))
            ),
        )
        told(f"Drawing {path.name}")
        self.workbench.starter.start(DRAW, data, listener)

    def save_numbers(self, path: Path) -> None:
        self.write_text(path, csv_of(*self.numbers()))

    def write_text(self, path: Path, text: str) -> None:
        """Writes the file and says so, or why not."""
        try:
            write_atomically(path, text.encode("utf-8"))
        except StudyError as error:
            self.workbench.told(str(error))
        else:
            self.workbench.told(f"Numbers saved as {path}.")

    def show_read_out(self, text: str) -> None:
        self._read_out.setText(text)

    def _log_switch(self, on: bool) -> QCheckBox:
        """A switch for a logarithmic axis, among the picture's own controls."""
        box = QCheckBox("Logarithmic")
        box.setChecked(on)
        describe(box, "Logarithmic", "Draws the vertical axis in decades, so that small values can be seen.")
        box.toggled.connect(lambda _: self.refresh_whole())
        self.controls.addSpacing(SPACE)
        self.controls.addWidget(box)
        return box

    def _head(self) -> QHBoxLayout:
        row = QHBoxLayout()
        row.setSpacing(2)
        row.addLayout(self.controls)
        row.addStretch(1)
        tools: list[tuple[str, str, str, Callable[[], None]]] = [
            ("fit", "Fit", "Shows all data again (double click, or 0).", self.fit),
            ("copy", "Copy", "Copies the picture to the clipboard.", self.copy_image),
            ("picture", "Save picture", "Saves the picture as PNG, SVG or PDF, drawn for print.", self._ask_picture),
            ("numbers", "Save numbers", "Saves the numbers behind the picture as CSV.", self._ask_numbers),
        ]
        for name, text, help, act in tools:
            button = QToolButton()
            button.setIcon(icon(name, LIGHT.ink, 16))
            button.setIconSize(QSize(16, 16))
            describe(button, text, help)
            button.setToolTip(f"{text}: {help}")
            button.clicked.connect(lambda _=False, act=act: act())
            row.addWidget(button)
            self._tools.append((button, name))
        return row

    def _ask_picture(self) -> None:
        dialog = self._dialog("Save picture", PICTURE_FILTER, "png")
        dialog.filterSelected.connect(lambda chosen: dialog.setDefaultSuffix(chosen.rsplit("*.", 1)[-1].rstrip(")")))
        dialog.fileSelected.connect(lambda path: self.save_picture(Path(path)))
        dialog.open()

    def _ask_numbers(self) -> None:
        dialog = self._dialog("Save numbers", "Comma-separated values (*.csv)", "csv")
        dialog.fileSelected.connect(lambda path: self.save_numbers(Path(path)))
        dialog.open()

    def _dialog(self, title: str, filters: str, suffix: str) -> QFileDialog:
        dialog = QFileDialog(self.window(), title)
        dialog.setAcceptMode(QFileDialog.AcceptMode.AcceptSave)
        dialog.setNameFilter(filters)
        dialog.setDefaultSuffix(suffix)
        dialog.selectFile(f"{self.title.lower()}.{suffix}")
        dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        return dialog
