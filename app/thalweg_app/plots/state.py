"""State: the leading weights beside the exact ones, what is known of the state, and natural occupations."""

from __future__ import annotations

from typing import ClassVar

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QHBoxLayout, QLabel, QSplitter, QVBoxLayout, QWidget

from thalweg_app.plots.chart_view import ChartView
from thalweg_app.plots.picture import Picture
from thalweg_app.presenters.tables import Table, occupations_chart, state_chart, state_figures, state_table
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.widgets.figure_grid import FigureGrid
from thalweg_app.widgets.number_table import NumberTable

NOTHING = Table((), (), (), ())


class StatePicture(Picture):
    title: ClassVar[str] = "State"
    about: ClassVar[str] = "Leading determinants against the exact state, particle number, spin, variance, fidelity, natural occupations."

    def __init__(self, workbench: Workbench) -> None:
        self.occupations = ChartView("Natural occupations")
        super().__init__(workbench)
        self._label = QLabel()
        self._label.setProperty("role", "heading")
        self.controls.addWidget(self._label)
        self.log = self._log_switch(True)
        self.figures = FigureGrid(4)
        self.figures.setMaximumWidth(960)
        self.table = NumberTable("Leading weights")
        self.occupations.read_out.connect(self.show_read_out)
        self._lower = QWidget()
        lower = QHBoxLayout(self._lower)
        lower.setContentsMargins(0, 6, 0, 0)
        lower.setSpacing(12)
        lower.addWidget(self.table, 1)
        lower.addWidget(self.occupations, 1)
        upper = QWidget()
        top = QVBoxLayout(upper)
        top.setContentsMargins(0, 0, 0, 0)
        top.addWidget(self.figures)
        top.addWidget(self.view, 1)
        split = QSplitter(Qt.Orientation.Vertical)
        split.setChildrenCollapsible(False)
        split.addWidget(upper)
        split.addWidget(self._lower)
        split.setStretchFactor(0, 3)
        split.setStretchFactor(1, 2)
        self.body.addWidget(split, 1)

    @property
    def charts(self) -> list[ChartView]:
        return [self.view, self.occupations]

    def refresh(self) -> None:
        run = self.workbench.ledger.selected
        result = None if run is None else run.result
        self._label.setText("" if run is None else f"Run {run.number}: {run.result.label}")
        self.view.show_chart(state_chart(result, self.log.isChecked()))
        self.occupations.show_chart(occupations_chart(result))
        self.figures.show_figures([] if result is None else state_figures(result))
        self.table.show_table(NOTHING if result is None else state_table(result))
        self._lower.setVisible(result is not None)
