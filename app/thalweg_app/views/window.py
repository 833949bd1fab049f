"""The window: set-up at the left, pictures at the right, the ledger under them."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import QSettings, QSize, Qt, QTimer
from PySide6.QtGui import QCloseEvent, QDragEnterEvent, QDropEvent
from PySide6.QtWidgets import QApplication, QMainWindow, QSplitter

from thalweg.study.events import Failed
from thalweg_app.colours import Palette
from thalweg_app.forms import TextEntry
from thalweg_app.plots.all_pictures import PICTURES
from thalweg_app.plots.chart_view import load_ahead
from thalweg_app.plots.curve import CurvePicture
from thalweg_app.plots.picture import Picture
from thalweg_app.plots.picture_tabs import PictureTabs
from thalweg_app.presenters.document import Recovery
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.theme import Theme, application_icon
from thalweg_app.views.dialogs import show_defect
from thalweg_app.views.files import Files
from thalweg_app.views.help_bubble import HelpBubble
from thalweg_app.views.ledger_view import LedgerView
from thalweg_app.views.menus import Menus
from thalweg_app.views.setup_column import SetupColumn
from thalweg_app.views.status_line import StatusLine

REDRAW_MS = 50
#: Rest after an edit before the figures are asked for; quick edits in a row ask once.
REST_MS = 90
AUTOSAVE_MS = 20_000
#: After the start, when the window stands and nobody waits for it.
PREPARE_MS = 300


class Window(QMainWindow):
    def __init__(self, workbench: Workbench, theme: Theme, recovery: Recovery) -> None:
        super().__init__()
        self.workbench, self.theme, self._recovery = workbench, theme, recovery
        self._may_close = False
        self.setWindowIcon(application_icon())
        self.setAcceptDrops(True)
        self.files = Files(self, workbench, recovery)
        self.help = HelpBubble(self)
        self.column = SetupColumn(workbench)
        self.pictures = PictureTabs(workbench)
        self.ledger_view = LedgerView(workbench.ledger)
        self.status = StatusLine(workbench)
        self._lay_out()
        self._make_timers()
        self._connect()
        self.menus = Menus(self)
        self._restore_place()
        self._apply_palette(theme.palette)
        theme.dress()
        self.refresh_title()
        self.redraw()

    @property
    def picture(self) -> Picture:
        """The picture shown."""
        return self.pictures.shown

    def show_picture(self, index: int) -> None:
        self.pictures.setCurrentIndex(index)
        self.picture.view.setFocus()

    def run(self) -> None:
        """Takes over what is still being typed, then runs."""
        self._commit_typing()
        self.workbench.run()

    def scan(self) -> None:
        """Takes over what is still being typed, shows the curve, and runs its points."""
        self._commit_typing()
        self.show_picture(PICTURES.index(CurvePicture))
        self.workbench.scans.start()

    def _commit_typing(self) -> None:
        focus = QApplication.focusWidget()
        if isinstance(focus, TextEntry):
            focus.commit()

    def start_from_selected(self) -> None:
        """Lets the search begin at the parameters of the selected run, and shows where that is said."""
        self.workbench.start_from_selected()
        if self.workbench.setup.start_line:
            self.column.show_start()

    def open_path(self, path: str) -> None:
        self.files.open(Path(path))

    def choose_difference_unit(self, unit: str) -> None:
        QSettings().setValue("difference_unit", unit)
        self.workbench.choose_difference_unit(unit)

    def toggle_full_screen(self) -> None:
        self.showNormal() if self.isFullScreen() else self.showFullScreen()

    def redraw(self) -> None:
        self.picture.refresh()

    def refresh_title(self) -> None:
        document, words = self.workbench.document, self.workbench.state_in_words
        self.setWindowTitle(f"{document.name}[*]{f' – {words}' if words else ''} – Thalweg")
        self.setWindowModified(document.is_dirty)

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:  # noqa: N802 - Qt's name
        if self.files.can_drop(event.mimeData()):
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:  # noqa: N802
        self.files.drop(event.mimeData())
        event.acceptProposedAction()

    def closeEvent(self, event: QCloseEvent) -> None:  # noqa: N802
        if not self._may_close and not self.files.close(self._close_now):
            event.ignore()
            return
        self._store_place()
        self._recovery.drop()
        event.accept()

    def _close_now(self) -> None:
        self._may_close = True
        self.close()

    def _lay_out(self) -> None:
        self.right = QSplitter(Qt.Orientation.Vertical)
        self.right.addWidget(self.pictures)
        self.right.addWidget(self.ledger_view)
        self.right.setStretchFactor(0, 3)
        self.right.setStretchFactor(1, 1)
        self.right.setChildrenCollapsible(False)
        self.whole = QSplitter(Qt.Orientation.Horizontal)
        self.whole.addWidget(self.column)
        self.whole.addWidget(self.right)
        self.whole.setStretchFactor(0, 0)
        self.whole.setStretchFactor(1, 1)
        self.whole.setChildrenCollapsible(False)
        self.setCentralWidget(self.whole)
        self.setStatusBar(self.status)

    def _make_timers(self) -> None:
        self._live = QTimer(self, singleShot=True, interval=REDRAW_MS)
        self._live.timeout.connect(self._redraw_live)
        self._draw = QTimer(self, singleShot=True, interval=0)
        self._draw.timeout.connect(self.redraw)
        self._rest = QTimer(self, singleShot=True, interval=REST_MS)
        self._rest.timeout.connect(self.workbench.figures.inspect)
        self._autosave = QTimer(self, interval=AUTOSAVE_MS)
        self._autosave.timeout.connect(self._keep)
        self._autosave.start()
        QTimer.singleShot(PREPARE_MS, self, self._load_ahead)

    def _connect(self) -> None:
        bench = self.workbench
        bench.runs.progressed.connect(lambda: self._live.isActive() or self._live.start())
        bench.runs.changed.connect(self.refresh_title)
        bench.scans.progressed.connect(lambda: self._live.isActive() or self._live.start())
        bench.point_opened.connect(lambda: self.show_picture(0))
        bench.runs.finished.connect(lambda _: self._keep())
        bench.document.changed.connect(self.refresh_title)
        bench.answer_changed.connect(self.refresh_title)
        bench.pictures_changed.connect(self._draw.start)
        bench.figures.needed.connect(self._rest.start)
        bench.defect.connect(self.show_failure)
        self.column.run_asked.connect(self.run)
        self.column.stop_asked.connect(bench.runs.stop)
        self.column.system.picture.atom_chosen.connect(bench.scans.pick_atom)
        self.column.system.open_asked.connect(self.files.ask_open)
        self.column.system.paste_asked.connect(self.files.ask_paste)
        self.column.system.sample_asked.connect(self.files.open_sample)
        self.ledger_view.use_asked.connect(bench.use_selected)
        self.ledger_view.start_asked.connect(self.start_from_selected)
        self.ledger_view.check_asked.connect(bench.check_selected)
        self.pictures.currentChanged.connect(lambda _: self.redraw())
        self.theme.changed.connect(self._apply_palette)

    def show_failure(self, failure: Failed) -> None:
        show_defect(self, failure)

    def _redraw_live(self) -> None:
        self.status.refresh()  # first: a progress bar paints at once all that waits to be painted
        self.picture.refresh_live()

    def _load_ahead(self) -> None:
        self._loading, self._ahead = load_ahead(), self.pictures.prepare()
        self._prepare()

    def _prepare(self) -> None:
        """One step at a time: what is typed or clicked meanwhile is dealt with between two."""
        if self._loading.is_alive() or next(self._ahead, self) is not self:
            QTimer.singleShot(PREPARE_MS, self, self._prepare)

    def _keep(self) -> None:
        self._recovery.keep(self.workbench.document)

    def _apply_palette(self, palette: Palette) -> None:
        self.column.set_palette(palette)
        self.ledger_view.set_palette(palette)
        self.pictures.set_palette(palette)

    def _restore_place(self) -> None:
        settings = QSettings()
        self.resize(QSize(1280, 800).boundedTo(self.screen().availableSize()))
        for name, restore in (("place", self.restoreGeometry), ("columns", self.whole.restoreState), ("rows", self.right.restoreState)):
            stored = settings.value(name)
            if stored is not None:
                restore(stored)
        if settings.value("columns") is None:
            self.whole.setSizes([self.column.sizeHint().width(), 900])
            self.right.setSizes([560, 190])
        self.workbench.choose_difference_unit(str(settings.value("difference_unit", "mEh")))

    def _store_place(self) -> None:
        settings = QSettings()
        settings.setValue("place", self.saveGeometry())
        settings.setValue("columns", self.whole.saveState())
        settings.setValue("rows", self.right.saveState())
