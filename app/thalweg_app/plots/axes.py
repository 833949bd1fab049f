"""Axes of the screen pictures: decades for error, names for bars, plain decimals elsewhere."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import pyqtgraph as pg
from PySide6.QtGui import QFontMetricsF, QGuiApplication

from thalweg_app.presenters.wording import minus

#: Pixels along the axis that a label needs, with room around it.
LABEL_HEIGHT = 22
#: Pixels between two names.
NAME_GAP = 7
_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


class PlainAxis(pg.AxisItem):
    """Decimal numbers with a true minus sign and without unit prefixes. `whole` leaves out what lies between whole numbers."""

    def __init__(self, orientation: str) -> None:
        super().__init__(orientation)
        self.enableAutoSIPrefix(False)
        self.setStyle(tickLength=-4, maxTickLevel=1, maxTextLevel=1)
        self._finest = 1.0
        self.whole = False

    def tickValues(self, minVal: float, maxVal: float, size: float) -> list[tuple[float, list[float]]]:  # noqa: N802
        levels: list[tuple[float, list[float]]] = super().tickValues(minVal, maxVal, size)
        if self.whole:
            levels = [(spacing, values) for spacing, values in levels if spacing >= 1] or [(1.0, [*range(math.ceil(minVal), math.floor(maxVal) + 1)])]
        self._finest = min((spacing for spacing, values in levels[:2] if len(values)), default=1.0)
        return levels

    def tickStrings(self, values: Sequence[float], scale: float, spacing: float) -> list[str]:  # noqa: N802 - overrides the library's
        finest = min(spacing, self._finest)  # every label of an axis has the same number of decimals
        places = max(0, math.ceil(-math.log10(finest) - 1e-9)) if finest > 0 else 0
        if places > 9:
            return [minus(f"{v:.3e}") for v in values]
        return [minus(f"{v:.{places}f}") for v in values]


class DecadeAxis(pg.AxisItem):
    """An axis whose data are base-ten logarithms: a tick a decade or fewer, or finer steps where fewer than two decades begin in sight."""

    def __init__(self, orientation: str) -> None:
        super().__init__(orientation)
        self.enableAutoSIPrefix(False)
        self.setStyle(tickLength=-4)

    def tickValues(self, minVal: float, maxVal: float, size: float) -> list[tuple[float, list[float]]]:  # noqa: N802
        decades = range(math.ceil(minVal), math.floor(maxVal) + 1)
        edge = (maxVal - minVal) * LABEL_HEIGHT / (2 * max(size, LABEL_HEIGHT))  # a label nearer to an end is not drawn
        if sum(minVal + edge <= d <= maxVal - edge for d in decades) < 2:
            return [(1.0, within_a_decade(minVal, maxVal, round(size / LABEL_HEIGHT)))]
        step = max(1, math.ceil(len(decades) * LABEL_HEIGHT / max(size, 1.0)))
        return [(float(step), [float(d) for d in decades if d % step == 0])]

    def tickStrings(self, values: Sequence[float], scale: float, spacing: float) -> list[str]:  # noqa: N802
        return logarithm_labels(values)


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
        metrics = QFontMetricsF(self.style["tickFont"] or QGuiApplication.font())
        longest = max((metrics.horizontalAdvance(n) for n in self._names), default=0.0)
        fits = longest + NAME_GAP < self.width() / max(1, len(values))
        return [self._names[int(v)] if fits else str(int(v) + 1) for v in values]


def within_a_decade(low: float, high: float, most: int) -> list[float]:
    """Logarithms of round numbers from 10**low to 10**high, two at least and `most` or so.

    They begin with 1, 2 or 5 where two of these are in sight, otherwise with any digit, otherwise they are equally spaced.
    """
    first = math.floor(low)
    for leads in ((1, 2, 5), range(1, 10)):
        places = (d + math.log10(lead) for d in range(first, math.floor(high) + 1) for lead in leads)
        if len(found := [p for p in places if low <= p <= high]) > 1:
            return found if len(found) <= most else [found[0], found[-1]]
    least, last = 10.0 ** (low - first), 10.0 ** (high - first)
    if not last - least > 1e-9:
        return [low]
    spacing = 10.0 ** math.floor(math.log10((last - least) / 2))
    spacing *= max((f for f in (2, 5) if 2 * f * spacing <= last - least), default=1)
    return [round(first + math.log10(k * spacing), 12) for k in range(math.ceil(least / spacing), math.floor(last / spacing) + 1)]


def logarithm_labels(exponents: Sequence[float]) -> list[str]:
    """`10⁻³` at a decade and `2×10⁻³` between two, with as many digits as the numbers have."""
    digits = next((n for n in range(7) if all(_has_digits(e, n) for e in exponents)), 7)
    return [_label(e, digits) for e in exponents]


def _lead(exponent: float) -> float:
    """The number before the power of ten, from 1 to below 10."""
    return float(10.0 ** (exponent - math.floor(exponent)))


def _has_digits(exponent: float, decimals: int) -> bool:
    return math.isclose(round(_lead(exponent), decimals), _lead(exponent), rel_tol=1e-9)


def _label(exponent: float, decimals: int) -> str:
    decade = math.floor(exponent)
    if exponent == decade:
        return power_of_ten(decade)
    lead = f"{_lead(exponent):.{decimals}f}"
    return lead if decade == 0 else f"{lead}×{power_of_ten(decade)}"


def power_of_ten(exponent: int) -> str:
    """`10⁻³`."""
    return "1" if exponent == 0 else f"10{str(exponent).translate(_SUPERSCRIPT)}"


def set_axis_colours(axis: Any, ink: str, line: str) -> None:
    axis.setPen(pg.mkPen(line))
    axis.setTickPen(pg.mkPen(line))
    axis.setTextPen(pg.mkPen(ink))
