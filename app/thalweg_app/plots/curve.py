"""Curve: energies along a path, their errors, what the curve yields, and the form that starts a scan."""

from __future__ import annotations

from pathlib import Path
from typing import ClassVar

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QCheckBox, QLabel, QMenu, QPushButton, QSplitter, QStackedWidget, QWidget

from thalweg_app.colours import Palette
from thalweg_app.forms import QuietCombo, describe
from thalweg_app.plots.picture import Picture
from thalweg_app.plots.scan_form import ScanForm
from thalweg_app.presenters.curve import (
    CurveUnits,
    curve_chart,
    curve_remarks,
    curve_sentence,
    curve_table,
    nearest_point,
    point_text,
    yield_figures,
    yield_table,
)
from thalweg_app.presenters.curve_numbers import scan_csv
from thalweg_app.presenters.scan_control import REFINED_BY, REFINEMENTS, scan_title
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.widgets.number_table import NumberTable
from thalweg_app.widgets.scrolled import scrolled_column

SIDE_WIDTH = 330


class CurvePicture(Picture):
    title: ClassVar[str] = "Curve"
    about: ClassVar[str] = "Dissociation or coupling curve with its error, and what the curve yields."

    def __init__(self, workbench: Workbench, parent: QWidget | None = None) -> None:
        super().__init__(workbench, parent)
        self.scans = workbench.scans
        self._make_controls()
        self.table = NumberTable("Points of the curve")
        self.stack = QStackedWidget()
        self.stack.addWidget(self.view)
        self.stack.addWidget(self.table)
        self._lay_out()
        self.view.read_out.disconnect()
        self.view.pointed.connect(self._read)
        self.view.chosen.connect(self._open_point)
        self.scans.changed.connect(self.refresh_shown)

    @property
    def units(self) -> CurveUnits:
        return CurveUnits(self.length.currentData(), self.workbench.difference_unit)

    def refresh(self) -> None:
        self._fill_choices()
        self.form.refresh()
        self._draw()

    def refresh_live(self) -> None:
        self._draw()

    def set_palette(self, palette: Palette) -> None:
        super().set_palette(palette)
        self.form.set_palette(palette)

    def numbers(self) -> tuple[list[str], list[list[object]]]:
        table = curve_table(self.scans.shown, self.units)
        return list(table.header), [list(row) for row in table.rows]

    def save_numbers(self, path: Path) -> None:
        """A finished curve goes out under a header of its units and settings."""
        result = None if self.scans.chosen is None or self.scans.live is not None else self.scans.chosen.result
        if result is None:
            super().save_numbers(path)
            return
        self.write_text(path, scan_csv(result, self.units))

    def _draw(self) -> None:
        shown, units = self.scans.shown, self.units
        self.view.show_chart(curve_chart(shown, units))
        self.table.show_table(curve_table(shown, units))
        self.sentence.setText(curve_sentence(shown, units))
        rows = yield_figures(shown, units)
        self.yields.show_table(yield_table(rows))
        self.yields.setVisible(bool(rows))
        for column, width in enumerate((112, 92, 92)):
            self.yields.setColumnWidth(column, width)
        self.remarks.setText("\n".join(curve_remarks(shown)))
        self.refine.setVisible(self.scans.live is None and self.scans.chosen is not None)
        self.resume.setVisible(self.scans.live is None and self.scans.chosen is not None and not self.scans.chosen.result.finished)

    def _change_unit(self) -> None:
        self._draw()
        self.view.fit()

    def _read(self, coordinate: float | None) -> None:
        shown = self.scans.shown
        self.show_read_out("" if shown is None or coordinate is None else point_text(shown, coordinate, self.units))

    def _open_point(self, coordinate: float) -> None:
        """The convergence of the point that was clicked."""
        shown = self.scans.shown
        if shown is None:
            return
        factor, unit = self.units.coordinate(shown.unit)
        point = nearest_point(shown, coordinate / factor)
        if point is not None and point.result is not None:
            self.workbench.show_point(point.result, f"{shown.axis} {point.coordinate * factor:.6g} {unit}".strip())

    def _make_controls(self) -> None:
        self.choice = QuietCombo()
        self.choice.setMinimumContentsLength(34)
        describe(self.choice, "Scan shown", "The scans of this session.")
        self.choice.activated.connect(lambda i: self.scans.choose(self.choice.itemData(i)))
        self.length = QuietCombo()
        self.length.addItem("ångström", "angstrom")
        self.length.addItem("bohr", "bohr")
        describe(self.length, "Unit of distances", "Unit in which distances are drawn and listed.")
        self.length.currentIndexChanged.connect(lambda _: self._change_unit())
        self.as_table = QCheckBox("Table")
        describe(self.as_table, "Table", "Lists the points instead of drawing them.")
        self.as_table.toggled.connect(lambda on: self.stack.setCurrentIndex(int(on)))
        self.resume = QPushButton("Complete")
        describe(self.resume, "Complete", "Runs the points that an interrupted scan still lacks.")
        self.resume.clicked.connect(self.scans.resume)
        self.refine = QPushButton("Refine")
        describe(self.refine, "Refine", f"Adds {REFINED_BY} points to the scan and runs only those.")
        menu = QMenu(self.refine)
        for where, text in REFINEMENTS.items():
            menu.addAction(text).triggered.connect(lambda _=False, where=where: self.scans.refine(where))
        self.refine.setMenu(menu)
        for part in (self.choice, self.length, self.as_table, self.resume, self.refine):
            self.controls.addWidget(part)

    def _lay_out(self) -> None:
        split = QSplitter(Qt.Orientation.Horizontal, self)
        split.setChildrenCollapsible(False)
        self.body.addWidget(split, 1)
        split.addWidget(self.stack)
        column = scrolled_column(split, SIDE_WIDTH)
        self.form = ScanForm(self.scans, column.parentWidget())
        self.sentence, self.remarks = QLabel(wordWrap=True), QLabel(wordWrap=True)
        self.sentence.setProperty("role", "heading")
        self.sentence.setAccessibleName("Verdict on the curve")
        self.remarks.setProperty("role", "muted")
        for label in (self.sentence, self.remarks):
            label.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self.yields = NumberTable("What the curves yield")
        self.yields.setSortingEnabled(False)
        self.yields.setFixedHeight(34 + 5 * 24)
        self.yields.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        column.addWidget(self.form)
        column.addWidget(self.sentence)
        column.addWidget(self.yields)
        column.addWidget(self.remarks)
        column.addStretch(1)
        split.setStretchFactor(0, 1)
        split.setSizes([640, SIDE_WIDTH])

    def _fill_choices(self) -> None:
        self.choice.blockSignals(True)
        self.choice.clear()
        for kept in self.scans.scans:
            self.choice.addItem(scan_title(kept), kept.number)
        chosen = self.scans.chosen
        self.choice.setCurrentIndex(-1 if chosen is None else self.choice.findData(chosen.number))
        self.choice.setEnabled(self.scans.live is None and bool(self.scans.scans))
        self.choice.blockSignals(False)
