"""Pens for curves and legend samples."""

from __future__ import annotations

from PySide6.QtGui import QColor, QPen

from thalweg_app.colours import Style

#: Wide antialiased pens are slow on long curves.
MAX_WIDE_POINTS = 2000
_DASHES: dict[str, list[float]] = {"dash": [5, 3], "dot": [1.2, 2.4], "dashdot": [5, 3, 1.2, 3], "longdash": [9, 4]}


def pen_of(style: Style, points: int = 0) -> QPen:
    """The pen of a style, thin and solid for a curve of many points."""
    is_long = points > MAX_WIDE_POINTS
    pen = QPen(QColor(style.colour))
    pen.setWidthF(1.0 if is_long else style.width)
    pen.setCosmetic(True)  # its width is in pixels, whatever the zoom
    if style.dash in _DASHES and not is_long:
        pen.setDashPattern(_DASHES[style.dash])
    return pen
