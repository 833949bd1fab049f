"""The lattice as sites and bonds: classes of bonds by colour and line style, sublattices by the filling of the sites."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QMouseEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QSizePolicy, QToolTip, QWidget

from thalweg.arrays import FloatArray
from thalweg.systems.lattice_graph import Bond, LatticeGraph
from thalweg_app.colours import LIGHT, OKABE_ITO, Palette
from thalweg_app.widgets.framed import framed_painter, write_in_the_middle

#: Line styles in the order in which classes of bonds appear; the colours go along, so that grey print tells them apart too.
STYLES = (Qt.PenStyle.SolidLine, Qt.PenStyle.DashLine, Qt.PenStyle.DotLine, Qt.PenStyle.DashDotLine, Qt.PenStyle.DashDotDotLine)
MARGIN, LEGEND = 32.0, 18.0
#: Part of a bond that is drawn where it leaves through an edge of the lattice.
STUB = 0.42
#: Above this many sites their numbers would hide the bonds.
MAX_NUMBERED = 60


@dataclass(frozen=True)
class BondLook:
    colour: str
    style: Qt.PenStyle


def bond_looks(graph: LatticeGraph) -> dict[str, BondLook]:
    """Class of bonds -> how it is drawn, in order of first appearance."""
    return {kind: BondLook(OKABE_ITO[i % len(OKABE_ITO)], STYLES[i % len(STYLES)]) for i, kind in enumerate(graph.bonds_per_class())}


class LatticePicture(QWidget):
    """Shows a graph; `values` colours the bonds by a figure such as a correlation instead of their class."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._graph: LatticeGraph | None = None
        self._kinds: tuple[str, ...] = ()
        self._looks: dict[str, BondLook] = {}
        self._bond_values: dict[tuple[int, int], float] = {}
        self._site_values: tuple[float, ...] = ()
        self._palette = LIGHT
        self.setMouseTracking(True)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumHeight(190)
        self.setAccessibleName("Picture of the lattice")
        self.setProperty("help", "<b>Picture of the lattice</b><br>Sites with their numbers; the classes of bonds differ in colour and line style. "
                                 "What lies under the pointer is told.")  # fmt: skip

    def sizeHint(self) -> QSize:  # noqa: N802 - Qt's name
        return QSize(320, 210)

    def set_palette(self, palette: Palette) -> None:
        self._palette = palette
        self.update()

    def show_graph(self, graph: LatticeGraph | None, kinds: tuple[str, ...] | None = None) -> None:
        """`kinds`: the classes of bonds that the model couples; all of them when None."""
        self._graph = graph
        self._looks = {} if graph is None else bond_looks(graph)
        self._kinds = kinds if kinds is not None else tuple(graph.bonds_per_class()) if graph is not None else ()
        self._bond_values, self._site_values = {}, ()
        counts = "" if graph is None else ", ".join(f"{n} {kind}" for kind, n in graph.bonds_per_class().items() if kind in self._kinds)
        self.setAccessibleDescription("no lattice" if graph is None else f"{graph.name}; bonds: {counts or 'none'}")
        self.update()

    def show_values(self, bonds: dict[tuple[int, int], float], sites: tuple[float, ...]) -> None:
        """Figures of the bonds (line width and sign by colour) and of the sites, told under the pointer."""
        self._bond_values, self._site_values = bonds, sites
        self.update()

    def paintEvent(self, event: QPaintEvent) -> None:  # noqa: N802
        painter = framed_painter(self, self._palette)
        graph = self._graph
        if graph is None or graph.n_sites == 0:
            write_in_the_middle(painter, self, self._palette, "No lattice to draw")
            return
        places = self._places(graph)
        for bond in graph.bonds:
            if bond.kind in self._kinds:
                self._draw_bond(painter, graph, bond, places)
        self._draw_sites(painter, graph, places)
        self._draw_legend(painter)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:  # noqa: N802
        text = self.told_at(event.position())
        QToolTip.showText(event.globalPosition().toPoint(), text, self) if text else QToolTip.hideText()

    def told_at(self, place: QPointF) -> str:
        """What is known of the site or bond at a place; empty between them."""
        graph = self._graph
        if graph is None or graph.n_sites == 0:
            return ""
        places = self._places(graph)
        here = np.array([place.x(), place.y()])
        gaps = np.linalg.norm(places - here, axis=1)
        site = int(np.argmin(gaps))
        if gaps[site] <= self._radius(graph, places) + 3:
            value = f": {self._site_values[site]:+.4f}" if site < len(self._site_values) else ""
            return f"Site {graph.site_name(site)}, sublattice {int(graph.sublattice[site]) + 1}{value}"
        drawn = [b for b in graph.bonds if b.kind in self._kinds and not b.wraps]
        near = min(drawn, key=lambda b: _gap(here, places[b.first], places[b.second]), default=None)
        if near is None or _gap(here, places[near.first], places[near.second]) > 5:
            return ""
        figure = self._bond_values.get((near.first, near.second))
        shown = f": {figure:+.4f}" if figure is not None else f", {near.kind}, weight {near.weight:g}"
        return f"Bond {graph.site_name(near.first)} – {graph.site_name(near.second)}{shown}"

    def _places(self, graph: LatticeGraph) -> FloatArray:
        """Site positions in pixels, shape (n, 2)."""
        drawing = np.asarray(graph.drawing, dtype=float) * np.array([1.0, -1.0])
        low, high = drawing.min(axis=0), drawing.max(axis=0)
        room = np.array([self.width() - 2 * MARGIN, self.height() - 2 * MARGIN - LEGEND])
        wide = np.where(high - low > 1e-9, high - low, 1.0)
        scale = float(min(room / wide)) if graph.n_sites > 1 else 1.0
        middle = np.array([self.width() / 2, (self.height() - LEGEND) / 2])
        return np.asarray(middle + (drawing - (low + high) / 2) * min(scale, 64.0))

    def _radius(self, graph: LatticeGraph, places: FloatArray) -> float:
        if graph.n_sites < 2:
            return 9.0
        gaps = np.linalg.norm(places[:, None] - places[None], axis=-1)
        np.fill_diagonal(gaps, np.inf)
        return float(np.clip(0.24 * gaps.min(), 2.5, 10.0))

    def _draw_bond(self, painter: QPainter, graph: LatticeGraph, bond: Bond, places: FloatArray) -> None:
        look = self._looks[bond.kind]
        value = self._bond_values.get((bond.first, bond.second))
        width = 1.6 if value is None else 1.0 + 5.0 * min(1.0, abs(value))
        colour = look.colour if value is None else OKABE_ITO[0] if value < 0 else OKABE_ITO[1]
        painter.setPen(QPen(QColor(colour), width, look.style if value is None else Qt.PenStyle.SolidLine))
        a, b = QPointF(*places[bond.first]), QPointF(*places[bond.second])
        if not bond.wraps:
            painter.drawLine(a, b)
            return
        shift = self._shortest_image(graph, bond, places)
        painter.drawLine(a, a + (b + shift - a) * STUB)
        painter.drawLine(b, b + (a - shift - b) * STUB)

    def _shortest_image(self, graph: LatticeGraph, bond: Bond, places: FloatArray) -> QPointF:
        """The lattice repeat, in pixels, that brings the far end of a wrapped bond next to its near end."""
        torus = np.asarray(graph.torus, dtype=float) * np.array([1.0, -1.0]) * self._pixels(graph, places)
        images = [i * torus[0] + j * torus[1] for i in (-1, 0, 1) for j in (-1, 0, 1)]
        best = min(images, key=lambda shift: float(np.linalg.norm(places[bond.second] + shift - places[bond.first])))
        return QPointF(*best)

    def _pixels(self, graph: LatticeGraph, places: FloatArray) -> float:
        """Pixels a unit of the drawing."""
        drawing = np.asarray(graph.drawing, dtype=float)
        far = int(np.argmax(np.linalg.norm(drawing - drawing[0], axis=1)))
        length = float(np.linalg.norm(drawing[far] - drawing[0]))
        return float(np.linalg.norm(places[far] - places[0])) / length if length else 1.0

    def _draw_sites(self, painter: QPainter, graph: LatticeGraph, places: FloatArray) -> None:
        radius = self._radius(graph, places)
        fills = (self._palette.accent, self._palette.raised, self._palette.border, self._palette.muted)
        numbered = graph.n_sites <= MAX_NUMBERED and radius > 7
        font = self.font()
        font.setPointSizeF(max(6.0, radius * 0.72))
        painter.setFont(font)
        for site, (x, y) in enumerate(places.tolist()):
            fill = QColor(fills[int(graph.sublattice[site]) % len(fills)])
            painter.setPen(QPen(QColor(self._palette.ink), 1.2))
            painter.setBrush(fill)
            box = QRectF(x - radius, y - radius, 2 * radius, 2 * radius)
            painter.drawEllipse(box)
            if numbered:
                painter.setPen(readable_on(fill, self._palette))
                painter.drawText(box, Qt.AlignmentFlag.AlignCenter, graph.site_name(site)[:3])

    def _draw_legend(self, painter: QPainter) -> None:
        painter.setFont(self.font())
        x, y = 10.0, self.height() - 11.0
        for kind, look in self._looks.items():
            if kind not in self._kinds:
                continue
            painter.setPen(QPen(QColor(look.colour), 1.8, look.style))
            painter.drawLine(QPointF(x, y), QPointF(x + 22, y))
            painter.setPen(QColor(self._palette.ink))
            painter.drawText(QPointF(x + 27, y + 4), kind)
            x += 40 + painter.fontMetrics().horizontalAdvance(kind)


def _gap(point: FloatArray, a: FloatArray, b: FloatArray) -> float:
    """From a point to a stretch, pixels."""
    along = b - a
    square = float(along @ along)
    t = 0.0 if square == 0 else float(np.clip((point - a) @ along / square, 0.0, 1.0))
    return float(np.linalg.norm(point - a - t * along))


def readable_on(fill: QColor, palette: Palette) -> QColor:
    """The colour of ink or of paper, whichever stands out more."""
    return max((QColor(palette.ink), QColor(palette.paper)), key=lambda colour: abs(colour.lightnessF() - fill.lightnessF()))
