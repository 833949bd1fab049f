"""One pair of axes on the screen: takes a `Panel` and changes only what differs from the last one."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import Qt
from PySide6.QtGui import QBrush, QColor, QFont

from thalweg.arrays import FloatArray
from thalweg_app.colours import Palette, style_of
from thalweg_app.plots.axes import DecadeAxis, NameAxis, PlainAxis, set_axis_colours
from thalweg_app.plots.pens import pen_of
from thalweg_app.presenters.chart import Band, Panel, Series

#: More marks than this melt into one another.
MAX_MARKS = 300
_MARKS = {"o": "o", "s": "s", "^": "t1", "D": "d", "v": "t", "p": "p", "*": "star"}


class PanelView:
    """Wraps a plot item. `log` and bars are fixed by the first panel shown; y of a log panel is in decades."""

    def __init__(self, panel: Panel, palette: Palette, font: QFont) -> None:
        self.log, self.has_bars = panel.log, bool(panel.categories)
        self._palette, self._panel = palette, panel
        bottom = NameAxis("bottom") if self.has_bars else PlainAxis("bottom")
        self.item = pg.PlotItem(axisItems={"left": DecadeAxis("left") if self.log else PlainAxis("left"), "bottom": bottom})
        self.item.hideButtons()
        self.item.setMenuEnabled(False)
        self.item.disableAutoRange()
        self.item.showGrid(x=True, y=True, alpha=0.12)
        for side in ("left", "bottom"):
            self.item.getAxis(side).setTickFont(font)
        self.item.getAxis("left").setWidth(92)
        self._curves: dict[str, Any] = {}
        self._levels: dict[str, Any] = {}
        self._bars: list[Any] = []
        self._whiskers: list[Any] = []
        self._band: Any = None
        self._banded: tuple[Band | None, Palette] | None = None
        self._framed: tuple[str, Palette] | None = None
        self._floor = 0.0
        self.hair = pg.InfiniteLine(angle=90, movable=False)
        self.hair.setVisible(False)
        self.item.addItem(self.hair, ignoreBounds=True)
        self.show(panel, palette)

    def show(self, panel: Panel, palette: Palette) -> None:
        self._panel, self._palette = panel, palette
        self._show_frame(panel.y_title, palette)
        axis = self.item.getAxis("bottom")
        if isinstance(axis, NameAxis):
            axis.set_names(panel.categories)
        else:
            axis.whole = all((s.x == np.round(s.x)).all() for s in panel.series)  # iterations, layers, frames
        self._show_band()
        self._show_levels()
        self._show_series()
        self._show_bars()

    def _show_frame(self, title: str, palette: Palette) -> None:
        if self._framed == (title, palette):
            return
        self._framed = (title, palette)
        for side in ("left", "bottom"):
            set_axis_colours(self.item.getAxis(side), palette.ink, palette.border)
        self.item.setLabel("left", title, color=palette.ink)
        self.hair.setPen(pg.mkPen(palette.muted, width=1))

    def height_of(self, values: FloatArray) -> FloatArray:
        """Data to axis coordinates: decades where the axis is logarithmic; what cannot be shown becomes NaN."""
        if not self.log:
            return values
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.where(values > 0, np.log10(values), np.nan)

    def x_range(self) -> tuple[float, float] | None:
        if self.has_bars:
            return -0.7, len(self._panel.categories) - 0.3
        return _extent(s.x for s in self._panel.series)

    def y_range(self) -> tuple[float, float] | None:
        """Everything drawn, with some air."""
        panel = self._panel
        heights = [self.height_of(s.y) for s in panel.series]
        heights += [self.height_of(np.array([level.value for level in panel.levels]))] if panel.levels else []
        if panel.band is not None and heights:
            border = self.height_of(np.array([panel.band.upper]))
            heights += [border + 0.35, border - 0.35] if self.log else [border]
        if panel.bars:
            heights += [self.height_of(b.values) for b in panel.bars] + [np.array([self._floor])]
        extent = _extent(heights)
        if extent is None:
            return None
        low, high = extent
        air = max((high - low) * 0.07, 1e-9 if not self.log else 0.3)
        return (low if panel.bars else low - air), high + air

    def read_out(self, x: float) -> tuple[float, list[str]] | None:
        """The place nearest to `x` that holds data, and what every curve or bar says there."""
        if self.has_bars:
            i = round(x)
            if not 0 <= i < len(self._panel.categories):
                return None
            return float(i), [self._panel.categories[i], *(f"{b.name} {b.values[i]:.6g}" for b in self._panel.bars if np.isfinite(b.values[i]))]
        found, place = [], None
        for series in reversed(self._panel.series):
            if series.x.size and series.legend:
                i = int(np.abs(series.x - x).argmin())
                place = float(series.x[i]) if place is None else place
                if np.isfinite(series.y[i]):
                    found.append(f"{series.name} {series.y[i]:.3e}" if self.log else f"{series.name} {series.y[i]:.9g}")
        return None if place is None else (place, found)

    def _show_series(self) -> None:
        wanted = {series.name: series for series in self._panel.series}
        for name in [n for n in self._curves if n not in wanted]:
            self.item.removeItem(self._curves.pop(name))
        for order, (name, series) in enumerate(wanted.items()):
            if name not in self._curves:
                self._curves[name] = pg.PlotDataItem(connect="finite", clipToView=True, autoDownsample=True, downsampleMethod="peak")
                self.item.addItem(self._curves[name])
            self._draw(self._curves[name], series)
            self._curves[name].setZValue(10 + order)
        self._show_error_bars()

    def _show_error_bars(self) -> None:
        """Whiskers of `Series.spread`, too short to be seen where the axis is in decades and the bar reaches below zero."""
        for whiskers in self._whiskers:
            self.item.removeItem(whiskers)
        self._whiskers = []
        for series in self._panel.series:
            if series.spread is None:
                continue
            middle, low, high = (self.height_of(series.y + shift * series.spread) for shift in (0, -1, 1))
            low = np.where(np.isfinite(low), low, middle)
            kept = np.isfinite(middle) & np.isfinite(high)
            colour = style_of(series.role, series.rank, self._palette).colour
            item = pg.ErrorBarItem(
                x=series.x[kept], y=middle[kept], top=(high - middle)[kept], bottom=(middle - low)[kept], beam=0.0, pen=pg.mkPen(colour, width=1)
            )
            item.setZValue(9)
            self.item.addItem(item, ignoreBounds=True)
            self._whiskers.append(item)

    def _draw(self, curve: Any, series: Series) -> None:
        style = style_of(series.role, series.rank, self._palette)
        marks = _MARKS.get(style.mark) if series.marks and series.x.size <= MAX_MARKS else None
        size = 7 if series.x.size <= 60 else 5
        curve.setPen(pen_of(style, series.x.size) if series.line else None)
        curve.setSymbol(marks)
        if marks:
            curve.setSymbolSize(size)
            curve.setSymbolPen(pg.mkPen(style.colour, width=1.2))
            curve.setSymbolBrush(pg.mkBrush(style.colour if style.filled else self._palette.raised))
        curve.setData(series.x, self.height_of(series.y))

    def _show_levels(self) -> None:
        wanted = {level.name: level for level in self._panel.levels}
        for name in [n for n in self._levels if n not in wanted]:
            self.item.removeItem(self._levels.pop(name))
        for name, level in wanted.items():
            if name not in self._levels:
                self._levels[name] = pg.InfiniteLine(angle=0, movable=False)
                self.item.addItem(self._levels[name], ignoreBounds=True)
            self._levels[name].setPen(pen_of(style_of(level.role, level.rank, self._palette)))
            self._levels[name].setPos(float(self.height_of(np.array([level.value]))[0]))
            self._levels[name].setZValue(5)

    def _show_bars(self) -> None:
        for bars in self._bars:
            self.item.removeItem(bars)
        self._bars = []
        panel = self._panel
        self._floor = self._bar_floor()
        stacked = all(np.isnan(a.values * b.values).all() for i, a in enumerate(panel.bars) for b in panel.bars[:i])
        width = 0.76 if stacked else 0.76 / max(1, len(panel.bars))
        for i, bars in enumerate(panel.bars):
            style = style_of(bars.role, bars.rank, self._palette)
            shift = 0.0 if stacked else (i - (len(panel.bars) - 1) / 2) * width
            places = np.flatnonzero(np.isfinite(self.height_of(bars.values)))
            brush = QBrush(QColor(style.colour), Qt.BrushStyle.SolidPattern if style.filled else Qt.BrushStyle.BDiagPattern)
            tops = self.height_of(bars.values[places])
            item = pg.BarGraphItem(x=places + shift, y0=self._floor, y1=tops, width=width * 0.94, brush=brush, pen=pg.mkPen(style.colour))
            self.item.addItem(item)
            self._bars.append(item)

    def _bar_floor(self) -> float:
        """Where bars stand: zero, or on a logarithmic axis the decade below the smallest."""
        extent = _extent(self.height_of(b.values) for b in self._panel.bars) if self.log else None
        return 0.0 if extent is None else float(np.floor(extent[0] - 0.05))

    def _show_band(self) -> None:
        band = self._panel.band
        if self._banded == (band, self._palette):
            return
        self._banded = (band, self._palette)
        if self._band is not None:
            for part in self._band:
                self.item.removeItem(part)
            self._band = None
        if band is None:
            return
        upper = float(self.height_of(np.array([band.upper]))[0])
        lower = upper - 40.0 if band.lower is None else float(self.height_of(np.array([band.lower]))[0])
        wash = pg.LinearRegionItem((lower, upper), orientation="horizontal", movable=False, brush=pg.mkBrush(self._palette.band), pen=pg.mkPen(None))
        inside = {"position": 0.99, "anchors": [(1.0, -0.05), (1.0, -0.05)], "color": self._palette.good, "movable": False}
        border = pg.InfiniteLine(upper, angle=0, pen=pg.mkPen(self._palette.good, width=1), label=band.text, labelOpts=inside)
        wash.setZValue(-20)
        border.setZValue(4)
        for part in (wash, border):
            self.item.addItem(part, ignoreBounds=True)
        self._band = (wash, border)


def _extent(arrays: Iterable[FloatArray]) -> tuple[float, float] | None:
    finite = [a[np.isfinite(a)] for a in arrays]
    finite = [a for a in finite if a.size]
    if not finite:
        return None
    return min(float(a.min()) for a in finite), max(float(a.max()) for a in finite)
