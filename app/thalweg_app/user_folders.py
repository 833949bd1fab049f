"""Where Thalweg keeps what belongs to the person and not to a session: the log of defects, and what can be made again."""

from __future__ import annotations

import os
import sys
import tempfile
from pathlib import Path

LOG_BYTES = 2**20
OLD_LOGS = 2


def state_folder() -> Path:
    """The system's place for logs and state of this person; made when missing, a temporary folder when that is refused."""
    folder = _usual_place() / "thalweg"
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError:
        return Path(tempfile.gettempdir())
    return folder if os.access(folder, os.W_OK) else Path(tempfile.gettempdir())


def _usual_place() -> Path:
    if sys.platform == "win32":
        return Path(os.environ.get("LOCALAPPDATA") or Path.home() / "AppData" / "Local")
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Logs"
    return Path(os.environ.get("XDG_STATE_HOME") or Path.home() / ".local" / "state")


def cache_folder() -> Path | None:
    """The system's place for what this person's programs can make again; None where nothing can be written there."""
    folder = _usual_cache() / "thalweg"
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError:
        return None
    return folder if os.access(folder, os.W_OK) else None


def _usual_cache() -> Path:
    if sys.platform == "win32":
        return Path(os.environ.get("LOCALAPPDATA") or Path.home() / "AppData" / "Local")
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Caches"
    return Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache")


def log_defect(error: BaseException) -> Path:
    """Appends the traceback to the log and returns the log's path."""
    import logging  # every start of the program would wait for it
    from logging.handlers import RotatingFileHandler

    path = state_folder() / "thalweg.log"
    handler = RotatingFileHandler(path, maxBytes=LOG_BYTES, backupCount=OLD_LOGS, encoding="utf-8")
    handler.setFormatter(logging.Formatter("%(asctime)s %(levelname)s %(message)s"))
    record = logging.LogRecord("thalweg", logging.ERROR, __file__, 0, "defect", None, (type(error), error, error.__traceback__))
    try:
        handler.emit(record)
    finally:
        handler.close()
    return path
