"""State: the leading weights beside the exact ones, what is known of the state, and natural occupations."""

from __future__ import annotations

from typing import ClassVar

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QHBoxLayout, QLabel, QSplitter, QVBoxLayout, QWidget

from thalweg.systems import LatticeModel
from thalweg_app.colours import Palette
from thalweg_app.forms import QuietCombo, describe
from thalweg_app.plots.chart_view import ChartView
from thalweg_app.plots.picture import Picture
from thalweg_app.presenters.sites import LISTS, bond_correlations, coupled_kinds, graph_of, lists_of, site_values, sites_table_of
from thalweg_app.presenters.tables import Table, occupations_chart, state_chart, state_figures, state_table
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.widgets.figure_grid import FigureGrid
from thalweg_app.widgets.lattice_picture import LatticePicture
from thalweg_app.widgets.number_table import NumberTable

NOTHING = Table((), (), (), ())


class StatePicture(Picture):
    title: ClassVar[str] = "State"
    about: ClassVar[str] = "Leading determinants against the exact state, particle number, spin, variance, fidelity, natural occupations."

    def __init__(self, workbench: Workbench, parent: QWidget | None = None) -> None:
        self.occupations = ChartView("Natural occupations")
        super().__init__(workbench, parent)
        self._label = QLabel()
        self._label.setProperty("role", "heading")
        self.controls.addWidget(self._label)
        self.log = self._log_switch(True)
        self.listed = QuietCombo()
        describe(self.listed, "Table", "What is listed under the picture.")
        self.listed.activated.connect(lambda _: self._show_table())
        self.controls.addWidget(self.listed)
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
        self.lattice = LatticePicture()
        lower.addWidget(self.lattice, 1)
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
        self._fill_lists(lists_of(result))
        self._show_table()
        graph = None if result is None or result.sites is None else graph_of(result)
        self.occupations.setVisible(graph is None)
        self.lattice.setVisible(graph is not None)
        if result is not None and graph is not None:
            system = result.spec.system
            self.lattice.show_graph(graph, coupled_kinds(system, graph) if isinstance(system, LatticeModel) else None)
            self.lattice.show_values(bond_correlations(result), site_values(result))
        self._lower.setVisible(result is not None)

    def set_palette(self, palette: Palette) -> None:
        super().set_palette(palette)
        self.lattice.set_palette(palette)

    def _fill_lists(self, keys: list[str]) -> None:
        """Keeps the choice where it is still among the lists."""
        if keys != [self.listed.itemData(i) for i in range(self.listed.count())]:
            chosen = self.listed.currentData()
            self.listed.clear()
            for key in keys:
                self.listed.addItem(LISTS[key], key)
            self.listed.setCurrentIndex(max(0, self.listed.findData(chosen)))
        self.listed.setVisible(len(keys) > 1)

    def _show_table(self) -> None:
        run = self.workbench.ledger.selected
        key = self.listed.currentData()
        if run is None:
            self.table.show_table(NOTHING)
        else:
            self.table.show_table(state_table(run.result) if key in (None, "weights") else sites_table_of(run.result, key))
