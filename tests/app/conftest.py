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


@pytest.fixture
def thalweg(capfd, tmp_path, monkeypatch):
    """Runs the command line in an empty folder; gives (exit status, standard output, standard error)."""
    from thalweg_app import cli

    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path / "state"))

    def run(*words: str, stdin: bytes | None = None) -> tuple[int, str, str]:
        capfd.readouterr()
        if stdin is not None:
            (tmp_path / "stdin").write_bytes(stdin)
            monkeypatch.setattr("sys.stdin", (tmp_path / "stdin").open())
        status = cli.main(list(words))
        return (status, *capfd.readouterr())

    return run


@pytest.fixture
def starter():
    from fake_starter import FakeStarter

    return FakeStarter()


@pytest.fixture
def window(qtbot, tmp_path, starter):
    """A window with a study of LiH whose jobs the test answers by hand."""
    import studies
    import windows

    made = windows.make(qtbot, tmp_path, starter)
    made.workbench.setup.load(studies.study())
    made.workbench.document.mark_pristine()
    return made
