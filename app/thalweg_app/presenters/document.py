"""The session as a document: its name, where it is saved, whether it has changed, and its recovery after a crash."""

from __future__ import annotations

import contextlib
import os
from pathlib import Path
from typing import Protocol

from thalweg.errors import StudyError
from thalweg.storage.session import SUFFIX, Session, load_session, now, save_session
from thalweg_app.presenters.history import History
from thalweg_app.presenters.ledger import Ledger
from thalweg_app.presenters.listeners import Listeners
from thalweg_app.presenters.scan_control import ScanControl
from thalweg_app.presenters.setup import SetupEditing

UNTITLED = "untitled"
MAX_RECENT = 10


class RecentFiles(Protocol):
    """Where the list of recent sessions is kept between starts."""

    def read(self) -> list[str]: ...
    def write(self, paths: list[str]) -> None: ...


class Document:
    """Ties set-up, ledger and scans to a file. `changed` tells of a new name or mark."""

    def __init__(self, setup: SetupEditing, ledger: Ledger, scans: ScanControl, history: History, recent: RecentFiles) -> None:
        self._setup, self._ledger, self._scans, self._history, self._recent = setup, ledger, scans, history, recent
        self._session = Session()
        self._saved_state = self._state()
        self.path: Path | None = None
        self._recovered_name = ""
        self.changed = Listeners()
        setup.changed.connect(self.changed)
        ledger.changed.connect(self.changed)
        scans.changed.connect(self.changed)

    @property
    def name(self) -> str:
        if self.path is not None:
            return self.path.name.removesuffix(SUFFIX).removesuffix(".json")
        return self._recovered_name or UNTITLED

    @property
    def is_dirty(self) -> bool:
        saved_spec, saved_rows = self._saved_state
        spec, rows = self._state()
        return spec != saved_spec or len(rows) != len(saved_rows) or any(a is not b for a, b in zip(rows, saved_rows, strict=True))

    @property
    def has_unsaved_results(self) -> bool:
        return self.is_dirty and bool(self._ledger.runs or self._scans.scans)

    @property
    def recent(self) -> list[str]:
        return self._recent.read()

    def start_new(self) -> None:
        """An empty session, with the set-up as it is."""
        self.take(Session(setup=self._setup.spec), None)

    def mark_pristine(self) -> None:
        """The present state counts as unchanged, e.g. the sample shown at the start."""
        self._saved_state = self._state()
        self.changed()

    def take(self, session: Session, path: Path | None) -> None:
        """Shows a session that was read from `path`."""
        self._session, self.path, self._recovered_name = session, path, ""
        if session.setup is not None:
            self._setup.load(session.setup)
        self._ledger.load(session.runs)
        self._scans.load(session.scans)
        self._history.clear()
        if path is not None:
            self._remember(path)
        self.mark_pristine()

    def save(self, path: Path) -> Path:
        """Writes the session; StudyError when it cannot. Gives the path with its ending."""
        full = path if path.name.endswith(".json") else path.with_name(path.name + SUFFIX)
        save_session(self.snapshot(full.name.removesuffix(SUFFIX).removesuffix(".json")), full)
        self.path, self._recovered_name = full, ""
        self._remember(full)
        self.mark_pristine()
        return full

    def snapshot(self, name: str = "") -> Session:
        """The session as it is now."""
        update = {"name": name or self.name, "setup": self._setup.spec, "runs": self._ledger.runs, "scans": self._scans.scans, "modified": now()}
        return self._session.model_copy(update=update)

    def restore(self, session: Session) -> None:
        """Shows what a crash left behind; it stays unsaved until the person saves it."""
        self.take(session, None)
        self._recovered_name = f"{session.name} (recovered)" if session.name else "recovered"
        self._saved_state = (None, ())
        self.changed()

    def _remember(self, path: Path) -> None:
        text = str(path.resolve())
        self._recent.write([text, *(p for p in self._recent.read() if p != text)][:MAX_RECENT])

    def _state(self) -> tuple[object, tuple[object, ...]]:
        return self._setup.spec, (*self._ledger.runs, *self._scans.scans)


class Recovery:
    """Keeps a copy of an unsaved session in a folder while the program runs; what is found there later is from a crash."""

    def __init__(self, folder: Path, process: int | None = None) -> None:
        self._folder = folder
        self._own = folder / f"{os.getpid() if process is None else process}{SUFFIX}"

    def keep(self, document: Document) -> None:
        """Writes the copy, or removes it when everything is saved. A full disk is no reason to disturb the person."""
        if not document.is_dirty:
            self.drop()
            return
        with contextlib.suppress(StudyError, OSError):
            self._folder.mkdir(parents=True, exist_ok=True)
            save_session(document.snapshot(), self._own)

    def drop(self) -> None:
        with contextlib.suppress(OSError):
            self._own.unlink(missing_ok=True)

    def left_behind(self) -> list[Path]:
        """Copies of processes that are gone, newest first."""
        if not self._folder.is_dir():
            return []
        found = [p for p in self._folder.glob(f"*{SUFFIX}") if p != self._own and not _is_alive(p.name.removesuffix(SUFFIX))]
        return sorted(found, key=lambda p: p.stat().st_mtime, reverse=True)

    @staticmethod
    def read(path: Path) -> Session | None:
        """The copy's session; None when it cannot be read."""
        try:
            return load_session(path)
        except StudyError:
            return None


def _is_alive(process: str) -> bool:
    if not process.isdigit():
        return False
    if os.name == "nt":  # there, signal 0 would interrupt the process instead of asking for it
        import ctypes

        handle = ctypes.windll.kernel32.OpenProcess(0x1000, False, int(process))  # type: ignore[attr-defined,unused-ignore]
        return bool(handle)
    try:
        os.kill(int(process), 0)
    except ProcessLookupError:
        return False
    except OSError:
        return True
    return True
