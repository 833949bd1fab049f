"""The table of atoms: every cell can be edited, rows can be added and removed."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QPersistentModelIndex, QSize, Qt
from PySide6.QtGui import QColor, QKeyEvent, QKeySequence
from PySide6.QtWidgets import QAbstractItemView, QHBoxLayout, QHeaderView, QTableView, QToolButton, QVBoxLayout, QWidget

from thalweg.systems import Molecule
from thalweg_app.colours import LIGHT, Palette
from thalweg_app.forms import describe
from thalweg_app.presenters.numbers import number_text
from thalweg_app.presenters.setup import SetupEditing
from thalweg_app.presenters.wording import minus
from thalweg_app.theme import icon
from thalweg_app.widgets.number_table import quiet

_Index = QModelIndex | QPersistentModelIndex
MAX_ROWS_SHOWN = 7


class AtomsModel(QAbstractTableModel):
    """Reads from the set-up and hands edits to it."""

    def __init__(self, setup: SetupEditing) -> None:
        super().__init__()
        self._setup = setup
        self._atoms: tuple[tuple[str, float, float, float], ...] = ()
        self._unit = "angstrom"
        self.palette = LIGHT

    def refresh(self) -> None:
        system = self._setup.spec.system
        atoms, unit = (system.atoms, system.unit) if isinstance(system, Molecule) else ((), "angstrom")
        if len(atoms) != len(self._atoms):
            self.beginResetModel()
            self._atoms, self._unit = atoms, unit
            self.endResetModel()
        else:
            self._atoms, self._unit = atoms, unit
            if atoms:
                self.dataChanged.emit(self.index(0, 0), self.index(len(atoms) - 1, 3))
        self.headerDataChanged.emit(Qt.Orientation.Horizontal, 0, 3)

    def rowCount(self, parent: _Index = QModelIndex()) -> int:  # noqa: N802, B008 - Qt's name and default
        return 0 if parent.isValid() else len(self._atoms)

    def columnCount(self, parent: _Index = QModelIndex()) -> int:  # noqa: N802, B008
        return 0 if parent.isValid() else 4

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = Qt.ItemDataRole.DisplayRole) -> Any:  # noqa: N802
        if role == Qt.ItemDataRole.DisplayRole:
            if orientation == Qt.Orientation.Vertical:
                return str(section + 1)
            unit = "Å" if self._unit == "angstrom" else "bohr"
            return ("Atom", f"x / {unit}", f"y / {unit}", f"z / {unit}")[section]
        if role == Qt.ItemDataRole.TextAlignmentRole and orientation == Qt.Orientation.Horizontal and section:
            return Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter
        return None

    def flags(self, index: _Index) -> Qt.ItemFlag:
        return Qt.ItemFlag.ItemIsSelectable | Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsEditable

    def data(self, index: _Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        path = f"system.atoms.{index.row()}.{index.column()}"
        error = self._setup.draft.errors.get(path)
        if role in (Qt.ItemDataRole.DisplayRole, Qt.ItemDataRole.EditRole):
            typed = self._setup.draft.typed.get(path)
            if typed is not None:
                return typed
            value = self._atoms[index.row()][index.column()]
            text = value if isinstance(value, str) else number_text(value)
            return minus(text) if role == Qt.ItemDataRole.DisplayRole else text
        if role == Qt.ItemDataRole.TextAlignmentRole and index.column():
            return Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter
        if error is not None and role == Qt.ItemDataRole.ForegroundRole:
            return QColor(self.palette.bad)
        if error is not None and role == Qt.ItemDataRole.ToolTipRole:
            return str(error)
        return None

    def setData(self, index: _Index, value: Any, role: int = Qt.ItemDataRole.EditRole) -> bool:  # noqa: N802
        if role != Qt.ItemDataRole.EditRole:
            return False
        self._setup.edit_atom(index.row(), index.column(), str(value))
        return True


class AtomsTable(QWidget):
    def __init__(self, setup: SetupEditing) -> None:
        super().__init__()
        self._setup = setup
        self.model = AtomsModel(setup)
        self.view = _View()
        self.view.setModel(self.model)
        quiet(self.view)
        self.view.verticalHeader().show()
        self.view.horizontalHeader().setMinimumSectionSize(36)
        self.view.horizontalHeader().setStretchLastSection(False)
        self.view.horizontalHeader().setSectionResizeMode(QHeaderView.ResizeMode.Stretch)
        self.view.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.view.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectItems)
        self.view.setEditTriggers(QAbstractItemView.EditTrigger.AllEditTriggers)
        describe(self.view, "Table of atoms", "Element and coordinates of each atom. Every cell can be edited; Delete removes the atom.")
        self.view.delete_pressed = self._remove
        self._add_button = self._button("add", "Add an atom", "Adds a hydrogen atom beside the last one.", setup.add_atom)
        self._remove_button = self._button("remove", "Remove the atom", "Removes the selected atom.", self._remove)
        buttons = QHBoxLayout()
        buttons.setContentsMargins(0, 0, 0, 0)
        buttons.addWidget(self._add_button)
        buttons.addWidget(self._remove_button)
        buttons.addStretch(1)
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.setSpacing(2)
        layout.addWidget(self.view)
        layout.addLayout(buttons)
        self.refresh()

    def refresh(self) -> None:
        self.model.refresh()
        rows = min(MAX_ROWS_SHOWN, max(1, self.model.rowCount()))
        self.view.setFixedHeight(rows * 24 + self.view.horizontalHeader().sizeHint().height() + 2)

    def set_palette(self, palette: Palette) -> None:
        self.model.palette = palette
        self._add_button.setIcon(icon("add", palette.ink, 16))
        self._remove_button.setIcon(icon("remove", palette.ink, 16))
        self.refresh()

    def _remove(self) -> None:
        row = self.view.currentIndex().row()
        if 0 <= row < self.model.rowCount():
            self._setup.remove_atom(row)

    def _button(self, picture: str, name: str, help: str, act: Any) -> QToolButton:
        button = QToolButton()
        button.setIcon(icon(picture, LIGHT.ink, 16))
        button.setIconSize(QSize(16, 16))
        describe(button, name, help)
        button.clicked.connect(lambda: act())
        return button


class _View(QTableView):
    delete_pressed: Any = None

    def keyPressEvent(self, event: QKeyEvent) -> None:  # noqa: N802 - Qt's name
        if event.matches(QKeySequence.StandardKey.Delete) and self.delete_pressed is not None:
            self.delete_pressed()
            return
        super().keyPressEvent(event)
