"""The line at the foot: what is computed now, how far it is, what waits, and what was just said."""

from __future__ import annotations

from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QLabel, QMenu, QProgressBar, QSizePolicy, QStatusBar, QToolButton

from thalweg_app.compiled import COMPILING
from thalweg_app.forms import describe
from thalweg_app.presenters.progress import estimate
from thalweg_app.presenters.summaries import system_label
from thalweg_app.presenters.wording import time_left
from thalweg_app.presenters.workbench import Workbench

TOLD_MS = 12_000


class StatusLine(QStatusBar):
    def __init__(self, workbench: Workbench) -> None:
        super().__init__()
        self._workbench = workbench
        self._text, self._left = QLabel(), QLabel()
        self._text.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Preferred)
        self._text.setAccessibleName("Status")
        self._text.setContentsMargins(10, 0, 0, 0)
        self._left.setProperty("role", "muted")
        self._bar = QProgressBar()
        self._bar.setTextVisible(False)
        self._bar.setFixedWidth(180)
        self._bar.setAccessibleName("Progress")
        self._waiting = QToolButton()
        self._waiting.setPopupMode(QToolButton.ToolButtonPopupMode.InstantPopup)
        describe(self._waiting, "Waiting runs", "Runs that wait; choose one to take it off the queue.")
        self._menu = QMenu(self._waiting)
        self._menu.aboutToShow.connect(self._fill_queue)
        self._waiting.setMenu(self._menu)
        self.setSizeGripEnabled(False)
        self.addWidget(self._text, 1)
        for part in (self._waiting, self._left, self._bar):
            self.addPermanentWidget(part)
        self._told, self._compiling = "", False
        self._forget = QTimer(self, singleShot=True, interval=TOLD_MS)
        self._forget.timeout.connect(lambda: self.tell(""))
        workbench.told.connect(self.tell)
        workbench.runs.changed.connect(self.refresh)
        workbench.scans.changed.connect(self.refresh)
        self.refresh()

    @property
    def text(self) -> str:
        return self._text.text()

    def tell(self, sentence: str) -> None:
        """Shows a sentence for a while; what is computed now comes before it."""
        self._told = sentence
        if sentence:
            self._forget.start()
        self.refresh()

    def show_compiling(self, on: bool) -> None:
        """Says so while a process compiles kernels: a first run may wait for it."""
        if on != self._compiling:
            self._compiling = on
            self.refresh()

    @property
    def _aside(self) -> str:
        return self._told or (COMPILING if self._compiling else "")

    def refresh(self) -> None:
        runs = self._workbench.runs
        live, scan = runs.live, self._workbench.scans.live
        for part in (self._bar, self._left):
            part.setVisible(live is not None or scan is not None)
        self._show_queue()
        if live is None and scan is not None:
            self._show_work(scan.text, scan.seconds_left, scan.fraction)
            return
        if live is None:
            self._show(self._aside or "Ready")
            return
        now = estimate(live)
        what = system_label(live.spec) if live.check_of is None else f"check of run {live.check_of}"
        self._show_work(f"{now.text}  ({what})", now.seconds_left, now.fraction)

    def _show_work(self, text: str, seconds_left: float | None, fraction: float | None) -> None:
        self._show(text + (f"    {self._aside}" if self._aside else ""))
        self._left.setText("" if seconds_left is None else time_left(seconds_left))
        self._bar.setRange(0, 0 if fraction is None else 1000)
        if fraction is not None:
            self._bar.setValue(round(1000 * min(1.0, max(0.0, fraction))))

    def _show(self, text: str) -> None:
        self._text.setText(text)
        self._text.setToolTip(text)

    def _show_queue(self) -> None:
        queue = self._workbench.runs.queue
        self._waiting.setVisible(bool(queue))
        self._waiting.setText(f"{len(queue)} waiting")

    def _fill_queue(self) -> None:
        self._menu.clear()
        runs = self._workbench.runs
        for queued in runs.queue:
            what = system_label(queued.spec) if queued.check_of is None else f"check of run {queued.check_of.number}"
            action = self._menu.addAction(f"Take off: {what}, {queued.spec.ansatz.title}, {queued.spec.optimizer.title}")
            action.triggered.connect(lambda _=False, queued=queued: runs.withdraw(queued))
