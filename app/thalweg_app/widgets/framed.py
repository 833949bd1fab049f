"""The frame that molecules and lattices are drawn in."""

from __future__ import annotations

from PySide6.QtCore import QRectF, Qt
from PySide6.QtGui import QColor, QPainter, QPen
from PySide6.QtWidgets import QWidget

from thalweg_app.colours import Palette


def framed_painter(widget: QWidget, palette: Palette) -> QPainter:
    """A smooth painter on the widget, whose ground and border are drawn; the border shows the focus."""
    painter = QPainter(widget)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    painter.setPen(QPen(QColor(palette.accent if widget.hasFocus() else palette.border)))
    painter.setBrush(QColor(palette.raised))
    painter.drawRoundedRect(QRectF(widget.rect()).adjusted(0.5, 0.5, -0.5, -0.5), 4, 4)
    return painter


def write_in_the_middle(painter: QPainter, widget: QWidget, palette: Palette, text: str) -> None:
    """What is said where there is nothing to draw."""
    painter.setPen(QColor(palette.muted))
    painter.drawText(widget.rect(), Qt.AlignmentFlag.AlignCenter, text)
