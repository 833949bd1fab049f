"""Draws a `Chart` on the screen: linked panels, zoom and pan, read-out under the pointer, double click to fit."""

from __future__ import annotations

import importlib
import threading
from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

from PySide6.QtCore import QPointF, QSize, Qt, Signal
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import QLabel, QSizePolicy, QStackedLayout, QVBoxLayout, QWidget

from thalweg_app.colours import LIGHT, Palette
from thalweg_app.plots.legend import Legend
from thalweg_app.presenters.chart import Chart, Panel

if TYPE_CHECKING:
    from thalweg_app.plots.panel_view import PanelView

#: Loads the plotting library, which takes long beside the rest of the window; nothing is drawn before there is a chart.
DRAWING = "thalweg_app.plots.panel_view"
ZOOM_STEP, PAN_STEP = 0.8, 0.1


def load_ahead() -> threading.Thread:
    """Loads the plotting library beside the window, so that the first picture finds it."""
    thread = threading.Thread(target=importlib.import_module, args=(DRAWING,), name="plotting library", daemon=True)
    thread.start()
    return thread


class ChartView(QWidget):
    """`read_out` carries the values under the pointer, an empty text when it is elsewhere.

    `pointed` carries the place under the pointer along x, None when it is elsewhere; `chosen` the place of a single click.
    """

    read_out = Signal(str)
    pointed = Signal(object)
    chosen = Signal(float)

    def __init__(self, name: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._chart = Chart(name)
        self._palette = LIGHT
        self._panels: list[PanelView] = []
        self._titled: tuple[str, Palette] | None = None
        self._follows = True
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setAccessibleName(name)
        self.legend = Legend()
        self._graphics: Any = None
        self._empty = QLabel(alignment=Qt.AlignmentFlag.AlignCenter, wordWrap=True)
        self._empty.setProperty("role", "muted")
        drawn = QWidget()
        self._below = QVBoxLayout(drawn)
        self._below.setContentsMargins(0, 0, 0, 0)
        self._below.setSpacing(2)
        self._below.addWidget(self.legend)
        self._stack = QStackedLayout(self)
        self._stack.addWidget(self._empty)
        self._stack.addWidget(drawn)

    @property
    def graphics(self) -> Any:
        """The drawing, made when it is needed first."""
        if self._graphics is None:
            import pyqtgraph as pg

            self._graphics = graphics = pg.GraphicsLayoutWidget()
            graphics.setFrameShape(graphics.Shape.NoFrame)
            graphics.setFocusPolicy(Qt.FocusPolicy.NoFocus)
            graphics.setBackground(self._palette.paper)
            graphics.ci.layout.setVerticalSpacing(2)
            graphics.ci.setContentsMargins(2, 2, 10, 2)
            self._moved = pg.SignalProxy(graphics.scene().sigMouseMoved, rateLimit=30, slot=self._on_move)
            graphics.scene().sigMouseClicked.connect(self._on_click)
            self._below.addWidget(graphics, 1)
        return self._graphics

    def sizeHint(self) -> QSize:  # noqa: N802 - Qt's name
        return QSize(640, 420)

    def minimumSizeHint(self) -> QSize:  # noqa: N802
        return QSize(200, 110)

    @property
    def chart(self) -> Chart:
        return self._chart

    def show_chart(self, chart: Chart) -> None:
        """Changes what differs. The range follows the data until the person zooms or pans."""
        fresh = self._chart.is_empty or chart.title != self._chart.title
        self._chart = chart
        self._empty.setText(chart.empty)
        self._stack.setCurrentIndex(0 if chart.is_empty else 1)
        self.setAccessibleDescription(chart.description or chart.empty)
        if not chart.is_empty:
            self._match_panels()
            self.legend.show_chart(chart, self._palette)
            if fresh or self._follows:
                self.fit()

    def prepare(self, chart: Chart) -> Iterator[None]:
        """Builds the axes of such a chart, one at each step, so that the first picture comes at once; ends when a chart is shown meanwhile."""
        if not self._panels:
            self._clear_panels()
            made = self._panels
            yield
            for panel in chart.panels:
                if self._panels is made:
                    self._add_panel(panel, is_last=panel is chart.panels[-1])
                    yield

    def set_palette(self, palette: Palette) -> None:
        self._palette = palette
        if self._graphics is not None:
            self._graphics.setBackground(palette.paper)
        self.show_chart(self._chart)

    def fit(self) -> None:
        """Shows all data and follows them again."""
        self._follows = True
        ranges = [r for p in self._panels if (r := p.x_range()) is not None]
        if ranges:
            low, high = min(r[0] for r in ranges), max(r[1] for r in ranges)
            bars = any(p.has_bars for p in self._panels)
            air = 0.0 if bars else max((high - low) * 0.03, 0.25 if high == low else 0.0)
            for panel in self._panels:
                panel.item.setXRange(low - air, high + air, padding=0)
        for panel in self._panels:
            if (heights := panel.y_range()) is not None:
                panel.item.setYRange(*heights, padding=0)

    def keyPressEvent(self, event: QKeyEvent) -> None:  # noqa: N802 - Qt's name
        moves = {Qt.Key.Key_Left: (-1, 0), Qt.Key.Key_Right: (1, 0), Qt.Key.Key_Up: (0, 1), Qt.Key.Key_Down: (0, -1)}
        key = Qt.Key(event.key())
        if key in (Qt.Key.Key_Plus, Qt.Key.Key_Equal):
            self._scale(ZOOM_STEP)
        elif key == Qt.Key.Key_Minus:
            self._scale(1 / ZOOM_STEP)
        elif key in (Qt.Key.Key_0, Qt.Key.Key_Home):
            self.fit()
        elif key in moves:
            self._pan(*moves[key])
        else:
            super().keyPressEvent(event)

    def _match_panels(self) -> None:
        panels = self._chart.panels
        same = len(panels) == len(self._panels) and all(
            v.log == p.log and v.has_bars == bool(p.categories) for v, p in zip(self._panels, panels, strict=True)
        )
        if same:
            for view, panel in zip(self._panels, panels, strict=True):
                view.show(panel, self._palette)
        else:
            self._build_panels(self._chart)
        if self._titled != (self._chart.x_title, self._palette):
            self._titled = (self._chart.x_title, self._palette)
            self._panels[-1].item.setLabel("bottom", self._chart.x_title, color=self._palette.ink)

    def _build_panels(self, chart: Chart) -> None:
        self._clear_panels()
        for panel in chart.panels:
            self._add_panel(panel, is_last=panel is chart.panels[-1])

    def _clear_panels(self) -> None:
        layout = self.graphics.ci.layout
        self.graphics.clear()
        for row in range(len(self._panels)):  # a row keeps its height when it has become empty
            layout.setRowStretchFactor(row, 0)
            layout.setRowPreferredHeight(row, 0)
        self._titled = None
        self._panels = []

    def _add_panel(self, panel: Panel, is_last: bool) -> None:
        """Puts a panel under those that there are."""
        from thalweg_app.plots.panel_view import PanelView

        view, row, layout = PanelView(panel, self._palette, self.font()), len(self._panels), self.graphics.ci.layout
        self._panels.append(view)
        self.graphics.addItem(view.item, row=row, col=0)
        layout.setRowStretchFactor(row, round(100 * panel.share))
        layout.setRowPreferredHeight(row, 1000 * panel.share)
        view.item.getViewBox().sigRangeChangedManually.connect(self._on_manual_range)
        if row:
            view.item.setXLink(self._panels[0].item)
        if not is_last:
            view.item.getAxis("bottom").setStyle(showValues=False)

    def _on_manual_range(self, *_: Any) -> None:
        self._follows = False

    def _on_click(self, event: Any) -> None:
        if event.double():
            self.fit()
            return
        place = self._place(event.scenePos())
        if place is not None and event.button() == Qt.MouseButton.LeftButton:
            self.chosen.emit(place)

    def _place(self, position: QPointF) -> float | None:
        """Where a point of the scene lies along x; None outside every panel."""
        under = next((p for p in self._panels if p.item.sceneBoundingRect().contains(position)), None)
        return None if under is None else float(under.item.getViewBox().mapSceneToView(position).x())

    def _on_move(self, arguments: tuple[QPointF]) -> None:
        position = arguments[0]
        self.pointed.emit(self._place(position))
        under = next((p for p in self._panels if p.item.sceneBoundingRect().contains(position)), None)
        found = None if under is None else under.read_out(under.item.getViewBox().mapSceneToView(position).x())
        for panel in self._panels:
            panel.hair.setVisible(found is not None)
            if found is not None:
                panel.hair.setPos(found[0])
        if found is None or under is None:
            self.read_out.emit("")
            return
        place, texts = found
        lead = texts.pop(0) if under.has_bars else f"{self._chart.x_title} {place:g}"
        unit = self._chart.panels[self._panels.index(under)].y_title
        self.read_out.emit(f"{lead}    {unit}:  " + "   ".join(texts))

    def leaveEvent(self, event: Any) -> None:  # noqa: N802
        for panel in self._panels:
            panel.hair.setVisible(False)
        self.read_out.emit("")
        self.pointed.emit(None)
        super().leaveEvent(event)

    def _scale(self, factor: float) -> None:
        self._follows = False
        for panel in self._panels:
            panel.item.getViewBox().scaleBy((factor, factor))

    def _pan(self, across: int, up: int) -> None:
        self._follows = False
        for i, panel in enumerate(self._panels):
            (x0, x1), (y0, y1) = panel.item.getViewBox().viewRange()
            sideways = across * PAN_STEP * (x1 - x0) if i == 0 else 0.0  # x is linked
            panel.item.getViewBox().translateBy(sideways, up * PAN_STEP * (y1 - y0))
