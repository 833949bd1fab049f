"""Hamiltonian: its Pauli terms, heaviest first, as bars and as a table."""

from __future__ import annotations

from typing import ClassVar

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLabel, QLineEdit, QSplitter, QWidget

from thalweg_app.forms import describe
from thalweg_app.plots.picture import Picture
from thalweg_app.presenters.tables import Table, terms_chart, terms_table
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.widgets.number_table import NumberTable

NO_TERMS = Table((), (), (), ())


class HamiltonianPicture(Picture):
    title: ClassVar[str] = "Hamiltonian"
    about: ClassVar[str] = "Pauli terms by weight, with a filter and the one-norm."

    def __init__(self, workbench: Workbench, parent: QWidget | None = None) -> None:
        super().__init__(workbench, parent)
        self.filter = QLineEdit()
        self.filter.setPlaceholderText("for example  X0 Y3  or  Z")
        self.filter.setClearButtonEnabled(True)
        self.filter.setFixedWidth(200)
        describe(self.filter, "Filter", "Shows terms that contain every factor given, such as X0 Y3, or a letter on any qubit, such as Z.")
        self.filter.textChanged.connect(lambda _: self.refresh())
        label = QLabel("Filter")
        label.setBuddy(self.filter)
        self.controls.addWidget(label)
        self.controls.addWidget(self.filter)
        self.log = self._log_switch(False)
        self._about = QLabel(wordWrap=True)
        self._about.setProperty("role", "muted")
        self.table = NumberTable("Pauli terms")
        split = QSplitter(Qt.Orientation.Vertical)
        split.addWidget(self.view)
        split.addWidget(self.table)
        split.setStretchFactor(0, 3)
        split.setStretchFactor(1, 2)
        split.setChildrenCollapsible(False)
        self.body.addWidget(self._about)
        self.body.addWidget(split, 1)

    def refresh(self) -> None:
        terms, wanted = self.workbench.terms, self.filter.text()
        self.view.show_chart(terms_chart(terms, wanted, self.log.isChecked()))
        table = NO_TERMS if terms is None else terms_table(terms, wanted)
        self.table.show_table(table)
        self.table.setVisible(terms is not None)
        self._about.setText(table.about)
        self._about.setVisible(bool(table.about))

    def numbers(self) -> tuple[list[str], list[list[object]]]:
        terms = self.workbench.terms
        if terms is None:
            return super().numbers()
        table = terms_table(terms, self.filter.text())
        return ["rank", *table.header[1:]], [list(row) for row in table.sort_keys]
