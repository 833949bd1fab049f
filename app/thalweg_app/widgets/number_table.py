"""A read-only table of text and figures: sorted by its headings, copied as text."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QPersistentModelIndex, Qt
from PySide6.QtGui import QGuiApplication, QKeyEvent, QKeySequence
from PySide6.QtWidgets import QAbstractItemView, QHeaderView, QTableView, QWidget

from thalweg_app.presenters.tables import Table

EMPTY = Table((), (), (), ())
_Index = QModelIndex | QPersistentModelIndex


class TableModel(QAbstractTableModel):
    def __init__(self) -> None:
        super().__init__()
        self._table = EMPTY
        self._order: list[int] = []
        self._sorting: tuple[int, Qt.SortOrder] | None = None

    def show(self, table: Table) -> None:
        if table == self._table:
            return
        self.beginResetModel()
        if table.header != self._table.header:
            self._sorting = None
        self._table = table
        self._order = self._sorted()
        self.endResetModel()

    def rowCount(self, parent: _Index = QModelIndex()) -> int:  # noqa: N802, B008 - Qt's name and default
        return 0 if parent.isValid() else len(self._table.rows)

    def columnCount(self, parent: _Index = QModelIndex()) -> int:  # noqa: N802, B008
        return 0 if parent.isValid() else len(self._table.header)

    def data(self, index: _Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        if role == Qt.ItemDataRole.DisplayRole:
            return self._table.rows[self._order[index.row()]][index.column()]
        if role == Qt.ItemDataRole.TextAlignmentRole:
            side = Qt.AlignmentFlag.AlignRight if self._table.numeric[index.column()] else Qt.AlignmentFlag.AlignLeft
            return side | Qt.AlignmentFlag.AlignVCenter
        return None

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = Qt.ItemDataRole.DisplayRole) -> Any:  # noqa: N802
        if orientation == Qt.Orientation.Horizontal:
            if role == Qt.ItemDataRole.DisplayRole:
                return self._table.header[section]
            if role == Qt.ItemDataRole.TextAlignmentRole and self._table.numeric[section]:
                return Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter
        return None

    def sort(self, column: int, order: Qt.SortOrder = Qt.SortOrder.AscendingOrder) -> None:
        if 0 <= column < len(self._table.header):
            self.layoutAboutToBeChanged.emit()
            self._sorting = (column, order)
            self._order = self._sorted()
            self.layoutChanged.emit()

    def _sorted(self) -> list[int]:
        rows = list(range(len(self._table.rows)))
        if self._sorting is not None:
            column, order = self._sorting
            rows.sort(key=lambda i: self._table.sort_keys[i][column], reverse=order == Qt.SortOrder.DescendingOrder)
        return rows


class NumberTable(QTableView):
    def __init__(self, name: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._model = TableModel()
        self.setModel(self._model)
        self.setAccessibleName(name)
        self.setSortingEnabled(True)
        self.horizontalHeader().setSortIndicator(-1, Qt.SortOrder.AscendingOrder)
        quiet(self)
        self.horizontalHeader().setStretchLastSection(False)

    def show_table(self, table: Table) -> None:
        new = table.header != self._model._table.header
        self._model.show(table)
        self.setAccessibleDescription(table.about)
        if new and table.header:
            self.resizeColumnsToContents()
            for column in range(len(table.header)):
                self.setColumnWidth(column, self.columnWidth(column) + 14)

    def keyPressEvent(self, event: QKeyEvent) -> None:  # noqa: N802 - Qt's name
        if event.matches(QKeySequence.StandardKey.Copy):
            QGuiApplication.clipboard().setText(selected_text(self))
            return
        super().keyPressEvent(event)


def quiet(view: QTableView) -> None:
    """The look that all tables share."""
    view.setShowGrid(False)
    view.setAlternatingRowColors(True)
    view.setWordWrap(False)
    view.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
    view.setTabKeyNavigation(False)
    view.setHorizontalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
    view.verticalHeader().hide()
    view.verticalHeader().setDefaultSectionSize(24)
    header = view.horizontalHeader()
    header.setHighlightSections(False)
    header.setDefaultAlignment(Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter)
    header.setSectionResizeMode(QHeaderView.ResizeMode.Interactive)
    header.setStretchLastSection(True)


def selected_text(view: QTableView) -> str:
    """Selected rows with their header, tab separated."""
    model = view.model()
    columns = [c for c in range(model.columnCount()) if not view.isColumnHidden(c)]
    rows = sorted({index.row() for index in view.selectionModel().selectedIndexes()})
    show = Qt.ItemDataRole.DisplayRole
    lines = ["\t".join(str(model.headerData(c, Qt.Orientation.Horizontal, show) or "") for c in columns)]
    lines += ["\t".join(str(model.index(r, c).data(show) or "") for c in columns) for r in rows]
    return "\n".join(lines)
