"""The pictures as tabs. A picture is built when it is shown first, or ahead by `prepare`."""

from __future__ import annotations

from collections.abc import Iterator

from PySide6.QtWidgets import QTabWidget, QVBoxLayout, QWidget

from thalweg_app.colours import LIGHT, Palette
from thalweg_app.plots.all_pictures import PICTURES
from thalweg_app.plots.picture import Picture
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.widgets.tab_order import visit_after


class PictureTabs(QTabWidget):
    """A list of pictures too: asking for one builds it."""

    def __init__(self, workbench: Workbench) -> None:
        super().__init__()
        self._workbench, self._palette = workbench, LIGHT
        self._built: dict[int, Picture] = {}
        self._pages: list[QVBoxLayout] = []
        self.setDocumentMode(True)
        self.setAccessibleName("Pictures")
        self.setMinimumSize(640, 340)  # no picture, whenever it is built, widens the window or squeezes the ledger
        for i, kind in enumerate(PICTURES):
            page = QWidget()
            self._pages.append(QVBoxLayout(page))
            self._pages[-1].setContentsMargins(0, 0, 0, 0)
            self.addTab(page, kind.title)
            self.setTabToolTip(i, f"{kind.about} (Ctrl+{i + 1})")

    def __len__(self) -> int:
        return len(PICTURES)

    def __getitem__(self, place: int) -> Picture:
        if place not in self._built:
            self._built[place] = self._build(place)
        return self._built[place]

    def __iter__(self) -> Iterator[Picture]:
        return (self[i] for i in range(len(self)))

    @property
    def shown(self) -> Picture:
        return self[self.currentIndex()]

    def prepare(self) -> Iterator[None]:
        """Builds ahead, a little at each step, so that none halts the window for long."""
        yield from self.shown.prepare()
        for place in range(len(self)):
            if place not in self._built:
                self._built[place] = self._build(place)
                yield

    def set_palette(self, palette: Palette) -> None:
        self._palette = palette
        for picture in self._built.values():
            picture.set_palette(palette)

    def _build(self, place: int) -> Picture:
        page = self._pages[place]
        picture = PICTURES[place](self._workbench, page.parentWidget())
        picture.set_palette(self._palette)
        page.addWidget(picture)
        picture.show()  # a layout would show it a turn later
        visit_after(self.tabBar(), picture)
        picture.order_focus()
        return picture
