"""Axes of the screen pictures: decades for error, names for bars, plain decimals elsewhere."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import pyqtgraph as pg

from thalweg_app.presenters.wording import minus

_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


class PlainAxis(pg.AxisItem):
    """Decimal numbers with a true minus sign and without unit prefixes."""

    def __init__(self, orientation: str) -> None:
        super().__init__(orientation)
        self.enableAutoSIPrefix(False)
        self.setStyle(tickLength=-4, maxTickLevel=1, maxTextLevel=1)
        self._finest = 1.0

    def tickValues(self, minVal: float, maxVal: float, size: float) -> list[tuple[float, list[float]]]:  # noqa: N802
        levels: list[tuple[float, list[float]]] = super().tickValues(minVal, maxVal, size)
        self._finest = min((spacing for spacing, values in levels[:2] if len(values)), default=1.0)
        return levels

    def tickStrings(self, values: Sequence[float], scale: float, spacing: float) -> list[str]:  # noqa: N802 - overrides the library's
        finest = min(spacing, self._finest)  # every label of an axis has the same number of decimals
        places = max(0, math.ceil(-math.log10(finest) - 1e-9)) if finest > 0 else 0
        if places > 9:
            return [minus(f"{v:.3e}") for v in values]
        return [minus(f"{v:.{places}f}") for v in values]


class DecadeAxis(pg.AxisItem):
    """An axis whose data are base-ten logarithms: a tick a decade, or fewer."""

    def __init__(self, orientation: str) -> None:
        super().__init__(orientation)
        self.enableAutoSIPrefix(False)
        self.setStyle(tickLength=-4)

    def tickValues(self, minVal: float, maxVal: float, size: float) -> list[tuple[float, list[float]]]:  # noqa: N802
        decades = range(math.ceil(minVal), math.floor(maxVal) + 1)
        if not decades:
            return [(1.0, [minVal, maxVal])]
        step = max(1, math.ceil(len(decades) * 22 / max(size, 1.0)))
        return [(float(step), [float(d) for d in decades if d % step == 0])]

    def tickStrings(self, values: Sequence[float], scale: float, spacing: float) -> list[str]:  # noqa: N802
        return [power_of_ten(v) for v in values]


class NameAxis(PlainAxis):
    """Names under bars while they fit; otherwise their ranks, with the names left to the read-out."""

    def __init__(self, orientation: str) -> None:
        super().__init__(orientation)
        self._names: tuple[str, ...] = ()

    def set_names(self, names: tuple[str, ...]) -> None:
        if names != self._names:
            self._names = names
            self.picture = None
            self.update()

    def tickValues(self, minVal: float, maxVal: float, size: float) -> list[tuple[float, list[float]]]:  # noqa: N802
        visible = range(max(0, math.ceil(minVal)), min(len(self._names) - 1, math.floor(maxVal)) + 1)
        if not visible:
            return [(1.0, [])]
        step = max(1, math.ceil(len(visible) * 26 / max(size, 1.0)))
        return [(float(step), [float(i) for i in visible if i % step == 0])]

    def tickStrings(self, values: Sequence[float], scale: float, spacing: float) -> list[str]:  # noqa: N802
        longest = max((len(n) for n in self._names), default=0)
        room = self.width() / max(1, len(values)) if values else 0.0
        fits = longest * 6.4 < room
        return [self._names[int(v)] if fits else str(int(v) + 1) for v in values]


def power_of_ten(exponent: float) -> str:
    """`10⁻³`; a plain number between decades."""
    if exponent != int(exponent):
        return minus(f"{10**exponent:.2g}")
    return "1" if exponent == 0 else f"10{str(int(exponent)).translate(_SUPERSCRIPT)}"


def set_axis_colours(axis: Any, ink: str, line: str) -> None:
    axis.setPen(pg.mkPen(line))
    axis.setTickPen(pg.mkPen(line))
    axis.setTextPen(pg.mkPen(ink))
