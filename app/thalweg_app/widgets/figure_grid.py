"""Names and values of derived figures in two columns; dimmed while they are stale."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QGridLayout, QLabel, QWidget

from thalweg_app.presenters.tables import Figure
from thalweg_app.theme import show_fresh


class FigureGrid(QWidget):
    def __init__(self, columns: int = 2, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._columns = columns
        self._labels: list[tuple[QLabel, QLabel]] = []
        self._grid = QGridLayout(self)
        self._grid.setContentsMargins(0, 0, 0, 0)
        self._grid.setHorizontalSpacing(6)
        self._grid.setVerticalSpacing(3)
        for column in range(columns):
            self._grid.setColumnStretch(2 * column + 1, 1)

    def show_figures(self, figures: Sequence[Figure], is_fresh: bool = True) -> None:
        while len(self._labels) < len(figures):
            self._add_pair()
        for i, (name, value) in enumerate(self._labels):
            for label in (name, value):
                label.setVisible(i < len(figures))
            if i < len(figures):
                name.setText(figures[i].name)
                value.setText(figures[i].value)
                value.setAccessibleName(f"{figures[i].name}: {figures[i].value}{'' if is_fresh else ', being worked out again'}")
                for label in (name, value):
                    label.setToolTip(figures[i].help)
                show_fresh(value, is_fresh)

    def _add_pair(self) -> None:
        row, column = divmod(len(self._labels), self._columns)
        name, value = QLabel(), QLabel()
        name.setProperty("role", "muted")
        value.setAlignment(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
        value.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        value.setContentsMargins(0, 0, 10 if column < self._columns - 1 else 0, 0)
        self._grid.addWidget(name, row, 2 * column)
        self._grid.addWidget(value, row, 2 * column + 1)
        self._labels.append((name, value))
