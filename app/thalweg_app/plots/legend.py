"""The legend above a picture: a row of samples with their names, outside the axes so that it hides nothing."""

from __future__ import annotations

from typing import Literal

from PySide6.QtCore import QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QBrush, QColor, QPainter, QPaintEvent, QPolygonF
from PySide6.QtWidgets import QSizePolicy, QWidget

from thalweg_app.colours import LIGHT, Palette, Style, style_of
from thalweg_app.plots.pens import pen_of
from thalweg_app.presenters.chart import Chart

SAMPLE, GAP, PADDING = 26, 6, 16


class Legend(QWidget):
    """Entries in the order of the chart, each name once; those that do not fit are left to the table of numbers."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._entries: list[tuple[str, Style, Literal["line", "bar"]]] = []
        self._palette = LIGHT
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.setAccessibleName("Legend")

    def show_chart(self, chart: Chart, palette: Palette) -> None:
        self._palette = palette
        self._entries = entries_of(chart, palette)
        self.setAccessibleDescription(", ".join(name for name, *_ in self._entries))
        self.setVisible(bool(self._entries))
        self.update()

    def sizeHint(self) -> QSize:  # noqa: N802 - Qt's name
        return QSize(200, self.fontMetrics().height() + 6)

    def paintEvent(self, event: QPaintEvent) -> None:  # noqa: N802
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        x, middle, metrics = 4.0, self.height() / 2, self.fontMetrics()
        for name, style, kind in self._entries:
            width = metrics.horizontalAdvance(name)
            if x + SAMPLE + GAP + width > self.width():
                break
            _draw_sample(painter, QPointF(x, middle), style, kind, self._palette)
            painter.setPen(QColor(self._palette.ink))
            painter.drawText(QPointF(x + SAMPLE + GAP, middle + metrics.ascent() / 2 - 1.5), name)
            x += SAMPLE + GAP + width + PADDING


def entries_of(chart: Chart, palette: Palette) -> list[tuple[str, Style, Literal["line", "bar"]]]:
    found: dict[str, tuple[Style, Literal["line", "bar"]]] = {}
    for panel in chart.panels:
        for series in reversed(panel.series):
            if series.legend:
                found.setdefault(series.name, (style_of(series.role, series.rank, palette), "line"))
        for level in panel.levels:
            found.setdefault(level.name, (style_of(level.role, level.rank, palette), "line"))
        for bars in panel.bars:
            found.setdefault(bars.name, (style_of(bars.role, bars.rank, palette), "bar"))
    return [(name, style, kind) for name, (style, kind) in found.items()]


def _draw_sample(painter: QPainter, at: QPointF, style: Style, kind: str, palette: Palette) -> None:
    if kind == "bar":
        pattern = Qt.BrushStyle.SolidPattern if style.filled else Qt.BrushStyle.BDiagPattern
        painter.setPen(QColor(style.colour))
        painter.setBrush(QBrush(QColor(style.colour), pattern))
        painter.drawRect(QRectF(at.x() + 7, at.y() - 5, 12, 10))
        return
    painter.setPen(pen_of(style))
    painter.drawLine(at, at + QPointF(SAMPLE, 0))
    painter.setPen(QColor(style.colour))
    painter.setBrush(QColor(style.colour if style.filled else palette.raised))
    _draw_mark(painter, at + QPointF(SAMPLE / 2, 0), style.mark)


def _draw_mark(painter: QPainter, c: QPointF, mark: str) -> None:
    shapes: dict[str, list[tuple[float, float]]] = {
        "s": [(-3.2, -3.2), (3.2, -3.2), (3.2, 3.2), (-3.2, 3.2)],
        "^": [(0, -4), (4, 3.2), (-4, 3.2)],
        "v": [(0, 4), (4, -3.2), (-4, -3.2)],
        "D": [(0, -4.2), (4.2, 0), (0, 4.2), (-4.2, 0)],
        "p": [(0, -4), (3.8, -1.2), (2.4, 3.4), (-2.4, 3.4), (-3.8, -1.2)],
        "*": [(0, -4.6), (1.2, -1.4), (4.4, -1.4), (1.8, 0.7), (2.8, 4), (0, 2), (-2.8, 4), (-1.8, 0.7), (-4.4, -1.4), (-1.2, -1.4)],
    }
    if mark == "o":
        painter.drawEllipse(c, 3.4, 3.4)
    elif mark in shapes:
        painter.drawPolygon(QPolygonF([c + QPointF(x, y) for x, y in shapes[mark]]))
