"""A column beside a picture that scrolls when the window is low."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QHBoxLayout, QScrollArea, QWidget


def scrolled(inner: QWidget, width: int) -> QScrollArea:
    """The widget in an area that is at least `width` wide and scrolls up and down only."""
    area = QScrollArea()
    area.setWidgetResizable(True)
    area.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
    area.setMinimumWidth(width)
    holder = QWidget()
    row = QHBoxLayout(holder)
    row.setContentsMargins(12, 0, 4, 0)
    row.addWidget(inner)
    area.setWidget(holder)
    return area
