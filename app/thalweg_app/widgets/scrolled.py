"""A column beside a picture that scrolls when the window is low."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QScrollArea, QSplitter, QVBoxLayout, QWidget


def scrolled_column(split: QSplitter, width: int) -> QVBoxLayout:
    """A column, to be filled, in an area at the end of `split` that is at least `width` wide and scrolls up and down only."""
    area = QScrollArea(split)
    area.setWidgetResizable(True)
    area.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
    area.setMinimumWidth(width)
    holder = QWidget(area.viewport())
    column = QVBoxLayout(holder)
    column.setContentsMargins(12, 0, 4, 0)
    column.setSpacing(8)
    area.setWidget(holder)
    split.addWidget(area)
    return column
