"""The menu bar with its keys: platform standard keys wherever there are any."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import TYPE_CHECKING

from PySide6.QtGui import QAction, QActionGroup, QKeySequence
from PySide6.QtWidgets import QApplication, QMenu

from thalweg_app.plots.all_pictures import PICTURES
from thalweg_app.presenters.wording import DIFFERENCE_UNITS, unit_name
from thalweg_app.views.dialogs import show_about

if TYPE_CHECKING:
    from thalweg_app.views.window import Window

Keys = QKeySequence.StandardKey
APPEARANCES = {"desktop": "As the desktop", "light": "Light", "dark": "Dark"}


class Menus:
    """Builds the menus of a window and keeps them up to date."""

    def __init__(self, window: Window) -> None:
        self._window = window
        self._bench = window.workbench
        self._file_menu()
        self._edit_menu()
        self._run_menu()
        self._view_menu()
        self._help_menu()
        self._bench.history.changed.connect(self.refresh)
        self._bench.runs.changed.connect(self.refresh)
        self._bench.scans.changed.connect(self.refresh)
        self._bench.setup.changed.connect(self.refresh)
        self._bench.ledger.selection_changed.connect(self.refresh)
        self._bench.figures.changed.connect(self.refresh)
        self.refresh()

    def refresh(self) -> None:
        history, runs = self._bench.history, self._bench.runs
        for action, verb, text in ((self.undo, "Undo", history.undo_text), (self.redo, "Redo", history.redo_text)):
            action.setText(f"{verb} {text}" if text else verb)
            action.setEnabled(bool(text))
        self.run.setEnabled(self._bench.can_run)
        self.scan.setEnabled(self._bench.can_run and self._bench.scans.live is None)
        self.stop.setEnabled(runs.is_running or self._bench.scans.live is not None)
        self.stop_all.setEnabled(runs.is_running)

    def _file_menu(self) -> None:
        files, menu = self._window.files, self._menu("&File")
        self.new = self._add(menu, "&New session", Keys.New, files.new_session, "Starts an empty ledger and keeps the set-up.")
        self.open = self._add(menu, "&Open…", Keys.Open, files.ask_open, "Opens a session, a geometry or integrals.")
        self._recent = menu.addMenu("Open &recent")
        self._recent.aboutToShow.connect(self._fill_recent)
        menu.addSeparator()
        self.save = self._add(menu, "&Save", Keys.Save, lambda: files.save(), "Saves set-up and ledger to one file.")
        self.save_as = self._add(menu, "Save &as…", Keys.SaveAs, lambda: files.ask_save(), "Saves under another name.")
        menu.addSeparator()
        self._add(menu, "Save &picture…", None, lambda: self._window.picture._ask_picture(), "Saves the picture shown as PNG, SVG or PDF.")
        self._add(menu, "Save n&umbers…", None, lambda: self._window.picture._ask_numbers(), "Saves the numbers of the picture as CSV.")
        menu.addSeparator()
        self._add(menu, "&Close", Keys.Close, self._window.close, "Closes the window.")
        self._add(menu, "&Quit", Keys.Quit, self._window.close, "Ends the program.", fallback="Ctrl+Q")

    def _edit_menu(self) -> None:
        menu, ledger = self._menu("&Edit"), self._window.ledger_view
        self.undo = self._add(menu, "Undo", Keys.Undo, self._bench.history.undo, "Takes back the last edit of set-up or ledger.")
        self.redo = self._add(menu, "Redo", Keys.Redo, self._bench.history.redo, "Does it again.")
        menu.addSeparator()
        self._add(menu, "Paste atoms…", None, self._window.files.ask_paste, "Reads a list of atoms from text.")
        self._add(menu, "Copy picture", "Ctrl+Shift+C", lambda: self._window.picture.copy_image(), "Copies the picture shown as an image.")
        menu.addSeparator()
        menu.addActions([ledger.use_action, ledger.start_action, ledger.delete_action])

    def _run_menu(self) -> None:
        menu, ledger = self._menu("&Run"), self._window.ledger_view
        self.run = self._add(menu, "&Run", "Ctrl+R", self._window.run, "Minimises the energy with the settings at the left.")
        self.scan = self._add(menu, "S&can", "Ctrl+Alt+R", self._window.scan, "Runs every point of the path that the Curve picture shows.")
        self.stop = self._add(menu, "&Stop", "Esc", self._bench.stop, "Ends the run or the scan and keeps what is finished.")
        self.stop_all = self._add(menu, "Stop &all", "Shift+Esc", self._bench.runs.stop_all, "Ends the run and empties the queue.")
        menu.addSeparator()
        ledger.check_action.setShortcut("Ctrl+Shift+R")
        menu.addAction(ledger.check_action)

    def _view_menu(self) -> None:
        menu, window = self._menu("&View"), self._window
        for i, picture in enumerate(PICTURES):
            self._add(menu, picture.title, f"Ctrl+{i + 1}", partial(window.show_picture, i), picture.about)
        menu.addSeparator()
        appearances = menu.addMenu("&Appearance")
        self._choices(appearances, APPEARANCES, window.theme.appearance, window.theme.choose)
        units = {unit: unit_name(unit) for unit in DIFFERENCE_UNITS}
        self._choices(menu.addMenu("Energy &differences in"), units, self._bench.difference_unit, window.choose_difference_unit)
        menu.addSeparator()
        self._add(menu, "&Full screen", Keys.FullScreen, window.toggle_full_screen, "Fills the screen, or gives it back.", fallback="F11")

    def _help_menu(self) -> None:
        menu = self._menu("&Help")
        self._add(menu, "What is &this?", "F1", lambda: self._window.help.show_for(QApplication.focusWidget()), "Explains the field with the focus.")
        self._add(menu, "&About Thalweg", None, lambda: show_about(self._window), "Version and licences.")

    def _menu(self, title: str) -> QMenu:
        menu = self._window.menuBar().addMenu(title)
        menu.setToolTipsVisible(True)
        return menu

    def _add(
        self, menu: QMenu, text: str, keys: QKeySequence.StandardKey | str | None, act: Callable[[], object], tip: str, fallback: str = ""
    ) -> QAction:
        action = QAction(text, self._window)
        if isinstance(keys, str):
            action.setShortcut(QKeySequence(keys))
        elif keys is not None:
            action.setShortcuts(QKeySequence.keyBindings(keys) or [QKeySequence(fallback)])
        action.setToolTip(tip)
        action.triggered.connect(lambda _=False: act())
        menu.addAction(action)
        return action

    def _choices(self, menu: QMenu, choices: dict[str, str], chosen: str, act: Callable[..., object]) -> None:
        group = QActionGroup(menu)
        for key, text in choices.items():
            action = QAction(text, menu, checkable=True)
            action.setChecked(key == chosen)
            action.triggered.connect(lambda _=False, key=key: act(key))
            group.addAction(action)
            menu.addAction(action)

    def _fill_recent(self) -> None:
        self._recent.clear()
        paths = self._bench.document.recent
        for path in paths:
            self._add(self._recent, path, None, partial(self._window.open_path, path), "Opens this session.")
        if not paths:
            self._recent.addAction("None yet").setEnabled(False)
