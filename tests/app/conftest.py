"""The window's tests run without a screen, with settings of their own, and never with a person's files."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
HELPERS = Path(__file__).parent / "helpers"
sys.path.insert(0, str(HELPERS))  # fake jobs are found by name, here and in worker processes


@pytest.fixture(autouse=True)
def _own_surroundings(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[None]:
    from PySide6.QtCore import QCoreApplication, QEvent, QSettings, QStandardPaths

    inherited = os.environ.get("PYTHONPATH")
    monkeypatch.setenv("PYTHONPATH", os.pathsep.join([str(HELPERS), *([inherited] if inherited else [])]))
    QStandardPaths.setTestModeEnabled(True)
    QSettings.setDefaultFormat(QSettings.Format.IniFormat)
    QSettings.setPath(QSettings.Format.IniFormat, QSettings.Scope.UserScope, str(tmp_path / "settings"))
    yield
    if QCoreApplication.instance() is not None:  # windows of earlier tests would slow every later one down
        QCoreApplication.sendPostedEvents(None, QEvent.Type.DeferredDelete)
