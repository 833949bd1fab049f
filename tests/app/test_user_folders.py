"""Defects are kept for a report, in a place of the person's own; threads are capped and a person's wish is obeyed."""

from __future__ import annotations

import os

import pytest

from thalweg_app import threads, user_folders
from thalweg_app.user_folders import log_defect, state_folder


def test_a_defect_is_logged_with_its_traceback_and_the_next_one_is_added(tmp_path, monkeypatch):
    monkeypatch.setattr(user_folders.sys, "platform", "linux")
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path))
    for text in ("first", "second"):
        try:
            raise ZeroDivisionError(text)
        except ZeroDivisionError as error:
            path = log_defect(error)
    assert path == tmp_path / "thalweg" / "thalweg.log"
    content = path.read_text()
    assert "ZeroDivisionError: first" in content
    assert "ZeroDivisionError: second" in content
    assert "Traceback" in content


def test_the_log_does_not_grow_without_end(tmp_path, monkeypatch):
    monkeypatch.setattr(user_folders.sys, "platform", "linux")
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path))
    monkeypatch.setattr(user_folders, "LOG_BYTES", 500)
    for _ in range(30):
        log_defect(ValueError("x" * 50))
    files = sorted((tmp_path / "thalweg").iterdir())
    assert len(files) <= 1 + user_folders.OLD_LOGS
    assert all(file.stat().st_size < 1000 for file in files)


def test_each_system_has_its_own_place(tmp_path, monkeypatch):
    monkeypatch.setenv("HOME", str(tmp_path))
    monkeypatch.setenv("LOCALAPPDATA", str(tmp_path / "Local"))
    monkeypatch.delenv("XDG_STATE_HOME", raising=False)
    places = {}
    for platform in ("linux", "darwin", "win32"):
        monkeypatch.setattr(user_folders.sys, "platform", platform)
        places[platform] = state_folder()
    assert places["linux"] == tmp_path / ".local" / "state" / "thalweg"
    assert places["darwin"] == tmp_path / "Library" / "Logs" / "thalweg"
    assert places["win32"] == tmp_path / "Local" / "thalweg"


def test_a_folder_that_cannot_be_made_is_replaced_by_a_temporary_one(tmp_path, monkeypatch):
    (tmp_path / "file").touch()
    monkeypatch.setattr(user_folders.sys, "platform", "linux")
    monkeypatch.setenv("XDG_STATE_HOME", str(tmp_path / "file"))
    assert state_folder().is_dir()


@pytest.mark.parametrize(("cores", "spared", "loops"), [(64, 0, "4"), (3, 0, "3"), (3, 1, "2"), (1, 1, "1")])
def test_threads_are_capped_and_a_setting_of_the_person_stays(monkeypatch, cores, spared, loops):
    for name in (*threads.LOOPS, *threads.ALGEBRA):
        monkeypatch.delenv(name, raising=False)
    monkeypatch.setenv("MKL_NUM_THREADS", "7")
    monkeypatch.setattr(threads, "usable_cores", lambda: cores)
    threads.cap_threads(spared)
    assert os.environ["OMP_NUM_THREADS"] == loops
    assert os.environ["OPENBLAS_NUM_THREADS"] == "1"
    assert os.environ["MKL_NUM_THREADS"] == "7"
