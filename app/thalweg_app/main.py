"""Builds the program's window. Everything lives inside a function: Qt objects that are module globals crash at exit."""

from __future__ import annotations

import faulthandler
import gc
import signal
import sys
import traceback
from collections.abc import Callable
from pathlib import Path
from types import TracebackType

from PySide6.QtCore import QStandardPaths, QTimer
from PySide6.QtWidgets import QApplication

from thalweg.study.events import Failed
from thalweg.systems.samples import list_samples
from thalweg_app.presenters.document import Recovery
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.theme import Theme, load_fonts
from thalweg_app.user_folders import log_defect, state_folder
from thalweg_app.views.files import StoredRecent
from thalweg_app.views.window import Window
from thalweg_app.worker import WorkerPool

FIRST_SAMPLE = "LiH"


def open_window(argv: list[str]) -> int:
    """Shows the window with the file named first in `argv`, or with a sample; returns the exit status."""
    with (state_folder() / "crash.log").open("a", encoding="utf-8") as crash_log:
        faulthandler.enable(crash_log)
        application = make_application()
        pool = WorkerPool()
        old_hook = sys.excepthook
        try:
            window = make_window(application, pool)
            sys.excepthook = defect_hook(window)
            signal.signal(signal.SIGINT, lambda *_: window.close())
            heartbeat = QTimer(interval=500)  # lets Python see Ctrl-C while Qt waits
            heartbeat.timeout.connect(lambda: None)
            heartbeat.start()
            window.show()
            QTimer.singleShot(0, lambda: begin(window, argv))
            QTimer.singleShot(0, settle)
            return application.exec()
        finally:
            gc.enable()
            pool.shut_down()
            sys.excepthook = old_hook
            faulthandler.disable()


def make_application() -> QApplication:
    application = QApplication.instance()
    if not isinstance(application, QApplication):
        application = QApplication(["thalweg", "-style", "fusion"])  # `setStyle` would hand the style to Python, which takes 30 ms
    application.setApplicationName("Thalweg")
    application.setOrganizationName("Thalweg")
    application.setApplicationDisplayName("Thalweg")
    application.setDesktopFileName("thalweg")
    load_fonts()
    return application


def make_window(application: QApplication, pool: WorkerPool) -> Window:
    workbench = Workbench(pool, StoredRecent())
    folder = Path(QStandardPaths.writableLocation(QStandardPaths.StandardLocation.AppLocalDataLocation)) / "recovery"
    window = Window(workbench, Theme(application), Recovery(folder))
    pool.changed.connect(lambda: window.status.show_compiling(pool.is_compiling))
    return window


def begin(window: Window, argv: list[str]) -> None:
    """What is shown first: the file asked for, or the sample; then what a crash left behind is offered."""
    if argv:
        window.open_path(argv[0])
    else:
        sample = next((s for s in list_samples() if s.name == FIRST_SAMPLE), None)
        if sample is not None:
            window.open_path(str(sample.file))
    window.workbench.document.mark_pristine()
    window.workbench.history.clear()
    window.files.offer_recovery()


def settle() -> None:
    """Collects garbage from now on, and leaves out what the start has made: a look through all of it would halt the window for long."""
    gc.freeze()
    gc.enable()


def defect_hook(window: Window) -> Callable[[type[BaseException], BaseException, TracebackType | None], None]:
    """Logs a defect and shows it once; the program lives on."""

    def hook(kind: type[BaseException], error: BaseException, trace: TracebackType | None) -> None:
        details = "".join(traceback.format_exception(kind, error, trace))
        sys.stderr.write(details)
        log = log_defect(error)
        window.show_failure(Failed(what=f"{kind.__name__}", why=str(error) or "no further words", fix=f"The log is {log}", details=details))

    return hook
