"""The drawing of a map of energies with its scale; loads the plotting library."""

from __future__ import annotations

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import QRectF
from PySide6.QtWidgets import QVBoxLayout, QWidget

from thalweg.study.diagnosis_result import LandscapeResult
from thalweg_app.colours import LIGHT, Palette
from thalweg_app.plots.axes import PlainAxis
from thalweg_app.presenters.wording import unit_name

#: From low to high, dark to light, so that grey print keeps the order.
SCALE = ("#0B2A3A", "#1F6F8B", "#5FB3CE", "#BFDDE6", "#FBFAF7")


class MapDrawing(QWidget):
    """The centre is marked by a cross, the lowest energy looked at by a ring."""

    def __init__(self) -> None:
        super().__init__()
        self._palette = LIGHT
        self._found: LandscapeResult | None = None
        self._graphics = pg.GraphicsLayoutWidget()
        self._graphics.setFrameShape(self._graphics.Shape.NoFrame)
        self._plot = self._graphics.addPlot(row=0, col=0, axisItems={side: PlainAxis(side) for side in ("left", "bottom")})
        self._image = pg.ImageItem()
        self._plot.addItem(self._image)
        self._centre = pg.ScatterPlotItem(symbol="+", size=14)
        self._lowest = pg.ScatterPlotItem(symbol="o", size=10)
        self._plot.addItem(self._centre)
        self._plot.addItem(self._lowest)
        self._bar = pg.ColorBarItem(colorMap=pg.ColorMap(np.linspace(0, 1, len(SCALE)), list(SCALE)), interactive=False, width=14)
        self._scale = PlainAxis("right")  # as wide as its numbers and its title need; that of the library has one width for all
        self._bar.setAxisItems({"right": self._scale})
        self._scale.unlinkFromView()
        self._scale.setStyle(showValues=True)
        self._bar.axis = self._scale
        self._bar.setImageItem(self._image, insert_in=self._plot)
        self.setAccessibleName("Map of energies")
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.addWidget(self._graphics)

    def show_map(self, found: LandscapeResult) -> None:
        self._found = found
        energies = np.array(found.energies)
        x, y = np.array(found.steps[0]), np.array(found.steps[1])
        step_x, step_y = x[1] - x[0], y[1] - y[0]
        self._image.setImage(energies)  # first axis along x
        self._image.setRect(QRectF(x[0] - step_x / 2, y[0] - step_y / 2, step_x * x.size, step_y * y.size))
        self._bar.setLevels((float(energies.min()), float(energies.max())))
        self._centre.setData([0.0], [0.0])
        row, column = found.lowest
        self._lowest.setData([x[row]], [y[column]])
        self.setAccessibleDescription(f"{found.verdict}; lowest {energies.min():.6f} {unit_name(found.unit)} at {x[row]:.3g}, {y[column]:.3g}")
        self._dress()

    def set_palette(self, palette: Palette) -> None:
        self._palette = palette
        self._graphics.setBackground(palette.paper)
        self._dress()

    def _dress(self) -> None:
        ink = self._palette.ink
        for mark in (self._centre, self._lowest):
            mark.setPen(pg.mkPen("#D55E00", width=2))
            mark.setBrush(pg.mkBrush(None))
        for side in ("left", "bottom"):
            axis = self._plot.getAxis(side)
            axis.setPen(ink)
            axis.setTextPen(ink)
        self._scale.setPen(ink)
        self._scale.setTextPen(ink)
        if self._found is not None:
            self._plot.setLabel("bottom", self._found.labels[0], color=ink)
            self._plot.setLabel("left", self._found.labels[1], color=ink)
            self._scale.setLabel(f"Energy / {unit_name(self._found.unit)}", color=ink)
