"""Convergence: the energy falling, and the error against the accuracy asked for."""

from __future__ import annotations

from collections.abc import Iterator
from typing import ClassVar

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLabel, QSplitter, QWidget

from thalweg_app.forms import QuietCombo, describe
from thalweg_app.plots.picture import Picture
from thalweg_app.presenters.chart import Chart, Panel
from thalweg_app.presenters.traces import ENERGY_SHARE, X_TITLES, growth_table
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.widgets.number_table import NumberTable

#: Has the panels of every convergence chart.
BLANK = Chart("Convergence", panels=(Panel("Energy", share=ENERGY_SHARE), Panel("Error", log=True)))


class ConvergencePicture(Picture):
    title: ClassVar[str] = "Convergence"
    about: ClassVar[str] = "Energy and error of the selected run, with the ticked runs laid over it."

    def __init__(self, workbench: Workbench, parent: QWidget | None = None) -> None:
        super().__init__(workbench, parent)
        self.axis = QuietCombo()
        for key, title in X_TITLES.items():
            self.axis.addItem(title, key)
        describe(self.axis, "Horizontal axis", "What the iterates are drawn against.")
        self.axis.currentIndexChanged.connect(lambda _: self.refresh_whole())
        label = QLabel("Against")
        label.setBuddy(self.axis)
        self.controls.addWidget(label)
        self.controls.addWidget(self.axis)
        self.growth = NumberTable("Steps of growth")
        self.growth.setMinimumHeight(112)
        split = QSplitter(Qt.Orientation.Vertical)
        split.setChildrenCollapsible(False)
        split.addWidget(self.view)
        split.addWidget(self.growth)
        split.setStretchFactor(0, 3)
        split.setStretchFactor(1, 1)
        self.body.addWidget(split, 1)

    def prepare(self) -> Iterator[None]:
        yield from self.view.prepare(BLANK)

    def refresh(self) -> None:
        self.refresh_live()
        bench = self.workbench
        table = growth_table(None if bench.runs.is_running else bench.shown_result, bench.difference_unit)
        self.growth.show_table(table)
        self.growth.setVisible(bool(table.rows))

    def refresh_live(self) -> None:
        self.view.show_chart(self.workbench.convergence(self.axis.currentData()))
