"""The ledger: one row a run."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QPersistentModelIndex, QSize, Qt, Signal
from PySide6.QtGui import QAction, QColor, QFont, QGuiApplication, QKeyEvent, QKeySequence
from PySide6.QtWidgets import QAbstractItemView, QHBoxLayout, QLabel, QMenu, QTableView, QToolButton, QVBoxLayout, QWidget

from thalweg.storage.session import Run
from thalweg_app.colours import LIGHT, Palette
from thalweg_app.forms import describe
from thalweg_app.presenters.answer import KINDS
from thalweg_app.presenters.ledger import COLUMNS, NOTE, Ledger
from thalweg_app.theme import SPACE, icon
from thalweg_app.widgets.number_table import quiet, selected_text

_Index = QModelIndex | QPersistentModelIndex
VERDICT = next(i for i, c in enumerate(COLUMNS) if c.name == "Verdict")
MAX_COLUMN = 230
#: Rows that the widths of columns follow; measuring hundreds would halt the window at the end of every run.
ROWS_MEASURED = 40


class LedgerModel(QAbstractTableModel):
    """Reads rows from the ledger; ticks and notes go back to it."""

    def __init__(self, ledger: Ledger) -> None:
        super().__init__()
        self._ledger = ledger
        self.rows: list[Run] = []
        self.palette = LIGHT
        self.refresh()

    def refresh(self) -> None:
        rows = self._ledger.rows
        if [r.number for r in rows] == [r.number for r in self.rows]:
            self.rows = rows
            if rows:
                self.dataChanged.emit(self.index(0, 0), self.index(len(rows) - 1, len(COLUMNS) - 1))
        else:
            self.beginResetModel()
            self.rows = rows
            self.endResetModel()
        self.headerDataChanged.emit(Qt.Orientation.Horizontal, 0, len(COLUMNS) - 1)

    def rowCount(self, parent: _Index = QModelIndex()) -> int:  # noqa: N802, B008 - Qt's name and default
        return 0 if parent.isValid() else len(self.rows)

    def columnCount(self, parent: _Index = QModelIndex()) -> int:  # noqa: N802, B008
        return 0 if parent.isValid() else len(COLUMNS)

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = Qt.ItemDataRole.DisplayRole) -> Any:  # noqa: N802
        if orientation != Qt.Orientation.Horizontal:
            return None
        if role == Qt.ItemDataRole.DisplayRole:
            return self._ledger.header[section]
        if role == Qt.ItemDataRole.ToolTipRole:
            return COLUMNS[section].help
        if role == Qt.ItemDataRole.TextAlignmentRole and COLUMNS[section].numeric and section:
            return Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter
        return None

    def flags(self, index: _Index) -> Qt.ItemFlag:
        flags = Qt.ItemFlag.ItemIsSelectable | Qt.ItemFlag.ItemIsEnabled
        if index.column() == 0:
            flags |= Qt.ItemFlag.ItemIsUserCheckable
        return flags | Qt.ItemFlag.ItemIsEditable if index.column() == NOTE else flags

    def data(self, index: _Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        run, column = self.rows[index.row()], COLUMNS[index.column()]
        if role in (Qt.ItemDataRole.DisplayRole, Qt.ItemDataRole.EditRole):
            return self._ledger.cell(run, index.column())
        if role == Qt.ItemDataRole.TextAlignmentRole and column.numeric and index.column():
            return Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter
        if role == Qt.ItemDataRole.CheckStateRole and index.column() == 0:
            return Qt.CheckState.Checked if self._ledger.is_ticked(run.number) else Qt.CheckState.Unchecked
        if index.column() == VERDICT:
            return self._verdict(run, role)
        return None

    def setData(self, index: _Index, value: Any, role: int = Qt.ItemDataRole.EditRole) -> bool:  # noqa: N802
        number = self.rows[index.row()].number
        if role == Qt.ItemDataRole.CheckStateRole:
            self._ledger.tick(number, Qt.CheckState(value) == Qt.CheckState.Checked)
            self.dataChanged.emit(index, index)
            return True
        if role == Qt.ItemDataRole.EditRole and index.column() == NOTE:
            self._ledger.annotate(number, str(value))
            return True
        return False

    def sort(self, column: int, order: Qt.SortOrder = Qt.SortOrder.AscendingOrder) -> None:
        if column >= 0:
            self._ledger.sort(column, order == Qt.SortOrder.DescendingOrder)

    def _verdict(self, run: Run, role: int) -> Any:
        if role == Qt.ItemDataRole.ForegroundRole:
            kind = KINDS.get(run.result.verdict_kind, "unclear")
            return QColor({"good": self.palette.good, "bad": self.palette.bad}.get(kind, self.palette.warning))
        if role == Qt.ItemDataRole.ToolTipRole:
            return run.result.verdict
        if role == Qt.ItemDataRole.FontRole:
            font = QFont(QGuiApplication.font())
            font.setWeight(QFont.Weight.Medium)
            return font
        return None


class LedgerView(QWidget):
    """`use_asked`, `start_asked` and `check_asked` concern the selected run."""

    use_asked = Signal()
    start_asked = Signal()
    check_asked = Signal()

    def __init__(self, ledger: Ledger) -> None:
        super().__init__()
        self._ledger = ledger
        self.model = LedgerModel(ledger)
        self.view = _Table()
        self.view.setModel(self.model)
        quiet(self.view)
        self.view.horizontalHeader().setResizeContentsPrecision(ROWS_MEASURED)
        self.view.setSortingEnabled(True)
        self.view.horizontalHeader().setSortIndicator(0, Qt.SortOrder.AscendingOrder)
        self.view.setSelectionMode(QAbstractItemView.SelectionMode.SingleSelection)
        self.view.setEditTriggers(QAbstractItemView.EditTrigger.DoubleClicked | QAbstractItemView.EditTrigger.EditKeyPressed)
        self.view.delete_pressed = self.delete_selected
        describe(self.view, "Ledger", "One row a run. Select a run to show it, tick it to lay it over the picture, double click its note to edit it.")
        self.view.setContextMenuPolicy(Qt.ContextMenuPolicy.CustomContextMenu)
        self.view.customContextMenuRequested.connect(lambda place: self._menu().exec(self.view.viewport().mapToGlobal(place)))
        self._empty = QLabel("Every run gets a row here: energy, error, verdict and cost.", alignment=Qt.AlignmentFlag.AlignCenter)
        self._empty.setProperty("role", "muted")
        self._make_actions()
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.setSpacing(0)
        layout.addLayout(self._head())
        layout.addWidget(self.view, 1)
        layout.addWidget(self._empty, 1)
        ledger.changed.connect(self.refresh)
        ledger.selection_changed.connect(self._show_selection)
        self.view.selectionModel().currentRowChanged.connect(self._on_row)
        self.refresh()

    def refresh(self) -> None:
        count = len(self.model.rows)
        self.model.refresh()
        has_rows = bool(self.model.rows)
        self.view.setVisible(has_rows)
        self._empty.setVisible(not has_rows)
        if len(self.model.rows) != count and has_rows:
            self._fit_columns()
        self._show_selection()

    def set_palette(self, palette: Palette) -> None:
        self.model.palette = palette
        for action, name in zip(self.actions_of_run, ("reuse", "begin", "check", "delete"), strict=True):
            action.setIcon(icon(name, palette.ink, 16))
        self.model.refresh()

    def delete_selected(self) -> None:
        if self._ledger.selected is not None:
            self._ledger.delete(self._ledger.selected.number)

    def _fit_columns(self) -> None:
        self.view.resizeColumnsToContents()
        for column in range(len(COLUMNS) - 1):
            self.view.setColumnWidth(column, min(MAX_COLUMN, self.view.columnWidth(column) + 6))

    def _show_selection(self) -> None:
        run = self._ledger.selected
        for action in self.actions_of_run:
            action.setEnabled(run is not None)
        self.start_action.setEnabled(self._ledger.can_start)
        row = next((i for i, r in enumerate(self.model.rows) if run is not None and r.number == run.number), -1)
        if row >= 0 and self.view.currentIndex().row() != row:
            self.view.selectRow(row)
            self.view.scrollTo(self.model.index(row, 0))

    def _on_row(self, current: QModelIndex) -> None:
        if current.isValid() and current.row() < len(self.model.rows):
            self._ledger.select(self.model.rows[current.row()].number)

    def _make_actions(self) -> None:
        self.use_action = QAction("Use this set-up", self)
        self.use_action.triggered.connect(lambda _=False: self.use_asked.emit())
        self.use_action.setToolTip("Puts the settings of the selected run back into the set-up column.")
        self.start_action = QAction("Start from this run", self)
        self.start_action.triggered.connect(lambda _=False: self.start_asked.emit())
        self.start_action.setToolTip("Lets the search of the set-up column begin at the final parameters of the selected run.")
        self.check_action = QAction("Check again", self)
        self.check_action.triggered.connect(lambda _=False: self.check_asked.emit())
        self.check_action.setToolTip("Repeats the selected run and states the deviation.")
        self.delete_action = QAction("Delete run", self)
        self.delete_action.triggered.connect(lambda _=False: self.delete_selected())
        self.delete_action.setToolTip("Takes the selected run out of the ledger; undo brings it back.")
        self.actions_of_run = (self.use_action, self.start_action, self.check_action, self.delete_action)

    def _menu(self) -> QMenu:
        menu = QMenu(self)
        menu.addActions([self.use_action, self.start_action, self.check_action])
        menu.addSeparator()
        menu.addAction(self.delete_action)
        return menu

    def _head(self) -> QHBoxLayout:
        title = QLabel("Ledger")
        title.setProperty("role", "heading")
        row = QHBoxLayout()
        row.setContentsMargins(12, 3, SPACE, 3)
        row.setSpacing(2)
        row.addWidget(title)
        row.addStretch(1)
        for action in self.actions_of_run:
            button = QToolButton()
            button.setDefaultAction(action)
            button.setToolButtonStyle(Qt.ToolButtonStyle.ToolButtonTextBesideIcon)
            button.setIconSize(QSize(16, 16))
            button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
            describe(button, action.text(), action.toolTip())
            row.addWidget(button)
        return row


class _Table(QTableView):
    delete_pressed: Any = None

    def keyPressEvent(self, event: QKeyEvent) -> None:  # noqa: N802 - Qt's name
        if event.matches(QKeySequence.StandardKey.Copy):
            QGuiApplication.clipboard().setText(selected_text(self))
        elif event.matches(QKeySequence.StandardKey.Delete) and self.delete_pressed is not None:
            self.delete_pressed()
        elif event.key() == Qt.Key.Key_Space and self.currentIndex().isValid():
            index = self.model().index(self.currentIndex().row(), 0)
            ticked = index.data(Qt.ItemDataRole.CheckStateRole) == Qt.CheckState.Checked
            self.model().setData(index, Qt.CheckState.Unchecked if ticked else Qt.CheckState.Checked, Qt.ItemDataRole.CheckStateRole)
        else:
            super().keyPressEvent(event)
