"""The molecule as balls and sticks, turned with the mouse or the arrow keys; bond lengths under the pointer."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from math import hypot

import numpy as np
from PySide6.QtCore import QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QBrush, QColor, QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QPen, QPixmap, QRadialGradient, QWheelEvent
from PySide6.QtWidgets import QSizePolicy, QToolTip, QWidget

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError
from thalweg.systems.elements import find_element
from thalweg.systems.geometry import Atoms, bonds, coordinates_in_bohr
from thalweg.units import BOHR_IN_ANGSTROM
from thalweg_app.colours import LIGHT, Palette
from thalweg_app.widgets.framed import framed_painter, write_in_the_middle

#: Colours by element as usual in the trade (common practice); others are drawn in a stone colour.
ELEMENT_COLOURS = {
    "H": "#E9E9E4",
    "He": "#CFEDEE",
    "Li": "#B79BD1",
    "Be": "#B9C96B",
    "B": "#E8B08F",
    "C": "#6B7075",
    "N": "#4F73C4",
    "O": "#CF4A40",
    "F": "#7FBF6A",
    "Ne": "#9ED6E0",
    "Na": "#9A7BC8",
    "Mg": "#7FA650",
    "Al": "#B7A9A6",
    "Si": "#C9AE86",
    "P": "#DE8D3B",
    "S": "#D8BE45",
    "Cl": "#5CAE57",
    "Ar": "#82C4D3",
}
OTHER_COLOUR = "#A89F94"
HELP = (
    "<b>Picture of the molecule</b><br>Drag or use the arrow keys to turn it, the wheel or + and - to zoom, double click to reset. "
    "Bond lengths appear under the pointer; a click on two atoms chooses their bond for a scan."
)
TURN = 0.011  # radians a pixel
CLICK = 4.0  # pixels that the mouse may move within a click
STICK = 0.24  # bohr, radius


@dataclass(frozen=True)
class _Ball:
    symbol: str
    at: QPointF
    depth: float
    radius: float
    number: int


class MoleculePicture(QWidget):
    """Shows atoms in `unit`; broken input shows what can be shown. `atom_chosen` carries the number of a clicked atom, counted from 1."""

    atom_chosen = Signal(int)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._atoms: Atoms = ()
        self._positions: FloatArray = np.zeros((0, 3))
        self._bonds: tuple[tuple[int, int], ...] = ()
        self._turn: FloatArray = np.eye(3)
        self._zoom = 1.0
        self._grip: QPointF | None = None
        self._pressed = QPointF()
        self._palette = LIGHT
        self.setMouseTracking(True)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.setMinimumHeight(172)
        self.setAccessibleName("Picture of the molecule")
        self.setProperty("help", HELP)

    def sizeHint(self) -> QSize:  # noqa: N802 - Qt's name
        return QSize(320, 172)

    def set_palette(self, palette: Palette) -> None:
        self._palette = palette
        self.update()

    def show_atoms(self, atoms: Atoms, unit: str) -> None:
        if atoms == self._atoms and self._positions.size and unit == getattr(self, "_unit", unit):
            return
        same_shape = [a[0] for a in atoms] == [a[0] for a in self._atoms]
        self._atoms, self._unit = atoms, unit
        try:
            positions = coordinates_in_bohr(atoms, unit) if atoms else np.zeros((0, 3))
            self._bonds = bonds(atoms, unit)
        except StudyError:
            positions, self._bonds = np.array([a[1:] for a in atoms], dtype=float), ()
        self._positions = positions - positions.mean(axis=0) if len(atoms) else positions
        if not same_shape:
            self.reset()
        self.setAccessibleDescription(", ".join(a[0] for a in atoms) or "no atoms")
        self.update()

    def reset(self) -> None:
        """Looks along the direction of least extent, a little from above."""
        self._zoom = 1.0
        if len(self._positions) > 1:
            _, _, axes = np.linalg.svd(self._positions)
            axes = axes if np.linalg.det(axes) > 0 else np.diag([1.0, 1.0, -1.0]) @ axes
            self._turn = _about_x(0.32) @ _about_y(-0.42) @ axes
        else:
            self._turn = np.eye(3)
        self.update()

    def bond_length(self, pair: tuple[int, int]) -> str:
        """`Li 1 - H 2: 1.5957 Å = 3.0154 bohr`."""
        i, j = pair
        length = float(np.linalg.norm(self._positions[i] - self._positions[j]))
        names = f"{self._atoms[i][0]} {i + 1} – {self._atoms[j][0]} {j + 1}"
        return f"{names}: {length * BOHR_IN_ANGSTROM:.4f} Å = {length:.4f} bohr"

    def paintEvent(self, event: QPaintEvent) -> None:  # noqa: N802
        painter = framed_painter(self, self._palette)
        if not self._atoms:
            write_in_the_middle(painter, self, self._palette, "Open, paste or drop a geometry, or take a sample")
            return
        balls = self._balls()
        parts: list[tuple[float, tuple[int, int] | int]] = [(b.depth, b.number) for b in balls]
        parts += [((balls[i].depth + balls[j].depth) / 2 - 1e-6, (i, j)) for i, j in self._bonds]
        for _, part in sorted(parts, key=lambda p: p[0]):
            if isinstance(part, tuple):
                self._draw_stick(painter, balls[part[0]], balls[part[1]])
            else:
                self._draw_ball(painter, balls[part])

    def bond_at(self, place: QPointF) -> tuple[int, int] | None:
        balls = self._balls()
        width = max(5.0, STICK * self._scale() + 2)
        near = [((balls[i].depth + balls[j].depth), (i, j)) for i, j in self._bonds if _distance(place, balls[i].at, balls[j].at) < width]
        return max(near)[1] if near else None

    def atom_at(self, place: QPointF) -> int | None:
        hit = [b for b in self._balls() if hypot(b.at.x() - place.x(), b.at.y() - place.y()) < b.radius]
        return max(hit, key=lambda b: b.depth).number if hit else None

    def mousePressEvent(self, event: QMouseEvent) -> None:  # noqa: N802
        self._grip = self._pressed = event.position()

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:  # noqa: N802
        self._grip = None
        moved = event.position() - self._pressed
        atom = self.atom_at(event.position())
        if atom is not None and hypot(moved.x(), moved.y()) < CLICK:
            self.atom_chosen.emit(atom + 1)

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:  # noqa: N802
        self.reset()

    def mouseMoveEvent(self, event: QMouseEvent) -> None:  # noqa: N802
        place = event.position()
        if self._grip is not None:
            moved = place - self._grip
            self._grip = place
            self._turn_by(moved.x() * TURN, moved.y() * TURN)
            return
        atom, bond = self.atom_at(place), self.bond_at(place)
        if atom is not None:
            symbol, x, y, z = self._atoms[atom]
            QToolTip.showText(event.globalPosition().toPoint(), f"{symbol} {atom + 1}: {x:.4f}, {y:.4f}, {z:.4f} {self._unit}", self)
        elif bond is not None:
            QToolTip.showText(event.globalPosition().toPoint(), self.bond_length(bond), self)
        else:
            QToolTip.hideText()

    def wheelEvent(self, event: QWheelEvent) -> None:  # noqa: N802
        if not self.hasFocus():  # otherwise the column scrolls
            event.ignore()
            return
        self._set_zoom(self._zoom * 1.0015 ** event.angleDelta().y())

    def keyPressEvent(self, event: QKeyEvent) -> None:  # noqa: N802
        turns = {Qt.Key.Key_Left: (-0.1, 0.0), Qt.Key.Key_Right: (0.1, 0.0), Qt.Key.Key_Up: (0.0, -0.1), Qt.Key.Key_Down: (0.0, 0.1)}
        key = Qt.Key(event.key())
        if key in turns:
            self._turn_by(*turns[key])
        elif key in (Qt.Key.Key_Plus, Qt.Key.Key_Equal, Qt.Key.Key_Minus):
            self._set_zoom(self._zoom * (1 / 1.15 if key == Qt.Key.Key_Minus else 1.15))
        elif key in (Qt.Key.Key_0, Qt.Key.Key_Home):
            self.reset()
        else:
            super().keyPressEvent(event)

    def _set_zoom(self, zoom: float) -> None:
        self._zoom = min(6.0, max(0.3, zoom))
        self.update()

    def _turn_by(self, across: float, down: float) -> None:
        self._turn = _about_x(down) @ _about_y(across) @ self._turn
        self.update()

    def _scale(self) -> float:
        """Pixels a bohr."""
        reach = [float(np.linalg.norm(p)) + _radius(a[0]) for p, a in zip(self._positions, self._atoms, strict=True)]
        return self._zoom * (min(self.width(), self.height()) / 2 - 5) / max(reach, default=1.0)

    def _balls(self) -> list[_Ball]:
        seen = self._positions @ self._turn.T
        scale, middle = self._scale(), QPointF(self.width() / 2, self.height() / 2)
        balls = []
        for number, ((x, y, z), atom) in enumerate(zip(seen.tolist(), self._atoms, strict=True)):
            balls.append(_Ball(atom[0], middle + QPointF(x * scale, -y * scale), z, _radius(atom[0]) * scale, number))
        return balls

    def _draw_ball(self, painter: QPainter, ball: _Ball) -> None:
        r = ball.radius
        drawn = _sphere(ELEMENT_COLOURS.get(ball.symbol, OTHER_COLOUR), max(2, round(2 * r)), self._palette.border, self.devicePixelRatioF())
        painter.drawPixmap(QRectF(ball.at.x() - r, ball.at.y() - r, 2 * r, 2 * r), drawn, QRectF(drawn.rect()))
        if r > 9:
            painter.setPen(QColor("#1F2933" if QColor(ELEMENT_COLOURS.get(ball.symbol, OTHER_COLOUR)).lightnessF() > 0.5 else "#FFFFFF"))
            font = self.font()
            font.setPointSizeF(max(7.0, min(12.0, r * 0.5)))
            painter.setFont(font)
            painter.drawText(QRectF(ball.at.x() - r, ball.at.y() - r, 2 * r, 2 * r), Qt.AlignmentFlag.AlignCenter, ball.symbol)

    def _draw_stick(self, painter: QPainter, a: _Ball, b: _Ball) -> None:
        """Two halves in the colours of their atoms, from surface to surface."""
        width = max(3.0, 2 * STICK * self._scale())
        middle = (a.at + b.at) / 2
        for ball in (a, b):
            towards = middle - ball.at
            length = hypot(towards.x(), towards.y())
            start = ball.at + towards * min(1.0, 0.8 * ball.radius / length if length else 1.0)
            for colour, share in ((self._palette.muted, 1.0), (_softened(ELEMENT_COLOURS.get(ball.symbol, OTHER_COLOUR)), 0.72)):
                painter.setPen(QPen(QColor(colour), width * share, Qt.PenStyle.SolidLine, Qt.PenCapStyle.FlatCap))
                painter.drawLine(start, middle)


@lru_cache(maxsize=128)
def _sphere(colour: str, size: int, rim: str, ratio: float) -> QPixmap:
    pixels = max(2, round(size * ratio))
    drawn = QPixmap(pixels, pixels)
    drawn.fill(Qt.GlobalColor.transparent)
    painter = QPainter(drawn)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    base = QColor(colour)
    shade = QRadialGradient(QPointF(0.5 * pixels, 0.5 * pixels), 0.52 * pixels, QPointF(0.36 * pixels, 0.32 * pixels))
    shade.setColorAt(0.0, base.lighter(128))
    shade.setColorAt(0.55, base)
    shade.setColorAt(1.0, base.darker(165))
    painter.setBrush(QBrush(shade))
    painter.setPen(QPen(base.darker(190), max(1.0, 0.02 * pixels)))
    painter.drawEllipse(QRectF(1, 1, pixels - 2, pixels - 2))
    painter.end()
    return drawn


def _radius(symbol: str) -> float:
    """Of a ball, bohr: smaller than the atom, so that the sticks are seen."""
    element = find_element(symbol)
    return 0.36 + 0.42 * ((element.covalent_radius if element else None) or 1.3) ** 0.7


def _softened(colour: str) -> str:
    return QColor(colour).darker(108).name()


def _about_x(angle: float) -> FloatArray:
    c, s = np.cos(angle), np.sin(angle)
    return np.array([[1, 0, 0], [0, c, -s], [0, s, c]])


def _about_y(angle: float) -> FloatArray:
    c, s = np.cos(angle), np.sin(angle)
    return np.array([[c, 0, s], [0, 1, 0], [-s, 0, c]])


def _distance(p: QPointF, a: QPointF, b: QPointF) -> float:
    """From a point to a stretch."""
    along = b - a
    square = along.x() ** 2 + along.y() ** 2
    t = 0.0 if square == 0 else max(0.0, min(1.0, ((p.x() - a.x()) * along.x() + (p.y() - a.y()) * along.y()) / square))
    nearest = a + along * t
    return hypot(p.x() - nearest.x(), p.y() - nearest.y())
