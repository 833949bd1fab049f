"""Energies over two directions as a map; the drawing is made when there is something to draw."""

from __future__ import annotations

from typing import TYPE_CHECKING

from PySide6.QtWidgets import QVBoxLayout, QWidget

from thalweg.study.diagnosis_result import LandscapeResult
from thalweg_app.colours import LIGHT, Palette

if TYPE_CHECKING:
    from thalweg_app.plots.map_drawing import MapDrawing


class MapView(QWidget):
    def __init__(self) -> None:
        super().__init__()
        self._palette = LIGHT
        self._drawing: MapDrawing | None = None
        self.setAccessibleName("Map of energies")
        self._layout = QVBoxLayout(self)
        self._layout.setContentsMargins(0, 0, 0, 0)

    def show_map(self, found: LandscapeResult) -> None:
        if self._drawing is None:
            from thalweg_app.plots.map_drawing import MapDrawing

            self._drawing = MapDrawing()
            self._drawing.set_palette(self._palette)
            self._layout.addWidget(self._drawing)
        self._drawing.show_map(found)
        self.setAccessibleDescription(self._drawing.accessibleDescription())

    def set_palette(self, palette: Palette) -> None:
        self._palette = palette
        if self._drawing is not None:
            self._drawing.set_palette(palette)
