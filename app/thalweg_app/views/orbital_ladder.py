"""Orbital energies as a ladder with occupations; a click or the space bar takes an orbital in or leaves it out."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import QEvent, QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QColor, QHelpEvent, QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QSizePolicy, QToolTip, QWidget

from thalweg.study.derived import Rung
from thalweg_app.colours import LIGHT, Palette
from thalweg_app.presenters.wording import minus

ROW = 18
TOP = 6
#: Energies nearer than this count as one level, Eh.
DEGENERATE = 1e-5


class OrbitalLadder(QWidget):
    """One row a level, highest on top; degenerate orbitals stand side by side. `toggled` carries an orbital's number."""

    toggled = Signal(int)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._rungs: tuple[Rung, ...] = ()
        self._rows: list[list[Rung]] = []
        self._current = 0
        self._is_fresh = True
        self._palette = LIGHT
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.setAccessibleName("Orbitals")
        self.setProperty("help", "<b>Orbitals</b><br>Click an orbital to take it into the active space or leave it out; with the keyboard, choose "
                                 "with the arrow keys and press the space bar. Filled: active. Dashed: frozen or left out.")  # fmt: skip

    def set_palette(self, palette: Palette) -> None:
        self._palette = palette
        self.update()

    def show_rungs(self, rungs: Sequence[Rung], is_fresh: bool) -> None:
        self._rungs, self._is_fresh = tuple(rungs), is_fresh
        ordered = sorted(rungs, key=lambda r: (-r.energy, -r.number))
        self._rows = []
        for rung in ordered:
            if self._rows and abs(self._rows[-1][-1].energy - rung.energy) < DEGENERATE:
                self._rows[-1].insert(0, rung)
            else:
                self._rows.append([rung])
        self._current = min(self._current, max(0, len(self._rungs) - 1))
        active = sum(r.active for r in rungs)
        self.setAccessibleDescription(f"{active} of {len(rungs)} orbitals active")
        self.setFixedHeight(2 * TOP + ROW * max(1, len(self._rows)))
        self.update()

    def sizeHint(self) -> QSize:  # noqa: N802 - Qt's name
        return QSize(320, 2 * TOP + ROW * max(1, len(self._rows)))

    def paintEvent(self, event: QPaintEvent) -> None:  # noqa: N802
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        p = self._palette
        painter.setPen(QPen(QColor(p.accent if self.hasFocus() else p.border)))
        painter.setBrush(QColor(p.raised))
        painter.drawRoundedRect(QRectF(self.rect()).adjusted(0.5, 0.5, -0.5, -0.5), 4, 4)
        if not self._rungs:
            painter.setPen(QColor(p.muted))
            painter.drawText(self.rect(), Qt.AlignmentFlag.AlignCenter, "Orbitals appear when the mean field is done")
            return
        painter.setOpacity(1.0 if self._is_fresh else 0.5)
        for row, rungs in enumerate(self._rows):
            y = TOP + row * ROW
            painter.setPen(QColor(p.muted))
            painter.drawText(QRectF(8, y, 92, ROW), Qt.AlignmentFlag.AlignVCenter | Qt.AlignmentFlag.AlignRight, minus(f"{rungs[0].energy:.4f} Eh"))
            for rung in rungs:
                self._draw_rung(painter, rung)

    def rung_at(self, place: QPointF) -> Rung | None:
        return next((r for r in self._rungs if self._place(r).contains(place)), None)

    def mousePressEvent(self, event: QMouseEvent) -> None:  # noqa: N802
        rung = self.rung_at(event.position())
        if rung is not None and event.button() == Qt.MouseButton.LeftButton:
            self._current = self._order().index(rung)
            self.toggled.emit(rung.number)

    def keyPressEvent(self, event: QKeyEvent) -> None:  # noqa: N802
        key = Qt.Key(event.key())
        if not self._rungs:
            super().keyPressEvent(event)
        elif key in (Qt.Key.Key_Up, Qt.Key.Key_Left):
            self._current = max(0, self._current - 1)
        elif key in (Qt.Key.Key_Down, Qt.Key.Key_Right):
            self._current = min(len(self._rungs) - 1, self._current + 1)
        elif key in (Qt.Key.Key_Space, Qt.Key.Key_Return):
            self.toggled.emit(self._order()[self._current].number)
        else:
            super().keyPressEvent(event)
        self.update()

    def event(self, event: QEvent) -> bool:
        if isinstance(event, QHelpEvent):
            rung = self.rung_at(QPointF(event.pos()))
            if rung is not None:
                QToolTip.showText(event.globalPos(), _describe(rung), self)
                return True
        return super().event(event)

    def _order(self) -> list[Rung]:
        return [rung for row in self._rows for rung in row]

    def _place(self, rung: Rung) -> QRectF:
        row = next(i for i, rungs in enumerate(self._rows) if rung in rungs)
        column, n = self._rows[row].index(rung), len(self._rows[row])
        left, width = 112.0, max(60.0, self.width() - 120.0)
        cell = min(118.0, width / n)
        begin = left + (width - n * cell) / 2
        return QRectF(begin + column * cell, TOP + row * ROW, cell, ROW)

    def _draw_rung(self, painter: QPainter, rung: Rung) -> None:
        p, place = self._palette, self._place(rung)
        if self.hasFocus() and self._order()[self._current] == rung:
            painter.setPen(Qt.PenStyle.NoPen)
            painter.setBrush(QColor(p.accent_wash))
            painter.drawRoundedRect(place.adjusted(1, 1, -1, -1), 3, 3)
        middle = place.center().y()
        begin, end = place.left() + 8, min(place.right() - 34, place.left() + 62)
        pen = QPen(QColor(p.accent if rung.active else p.muted), 2.4 if rung.active else 1.4)
        if not rung.active:
            pen.setDashPattern([3, 2])
        painter.setPen(pen)
        painter.drawLine(QPointF(begin, middle), QPointF(end, middle))
        self._draw_electrons(painter, rung, (begin + end) / 2, middle)
        painter.setPen(QColor(p.ink if rung.active else p.muted))
        name = f"{rung.number} {rung.irrep}".strip()
        painter.drawText(QRectF(end + 6, place.top(), place.right() - end - 4, ROW), Qt.AlignmentFlag.AlignVCenter, name)

    def _draw_electrons(self, painter: QPainter, rung: Rung, x: float, y: float) -> None:
        painter.setPen(QPen(QColor(self._palette.ink if rung.active else self._palette.muted), 1.3))
        for i in range(round(rung.occupation)):
            at, way = x - 4 + 8 * i, 1 if i == 0 else -1
            painter.drawLine(QPointF(at, y + 6), QPointF(at, y - 6))
            painter.drawLine(QPointF(at, y - 6 * way), QPointF(at - 2.5 * way, y - 2.8 * way))


def _describe(rung: Rung) -> str:
    state = "active" if rung.active else "frozen, doubly occupied" if rung.frozen else "left out"
    irrep = f", {rung.irrep}" if rung.irrep else ""
    return f"Orbital {rung.number}{irrep}: {minus(f'{rung.energy:.6f}')} Eh, occupation {rung.occupation:g}, {state}. Click to change."
