"""Compiled kernels are kept in a folder of the person's, by version, also for a read-only installation; compiling is announced."""

from __future__ import annotations

import os
import shutil
import stat
import subprocess
import sys
import time
from pathlib import Path

import pytest

import thalweg
from thalweg_app import compiled, rehearsals, user_folders
from thalweg_app.compiled import Announcer, compiled_folder, keep_compiled, kernel_digest


@pytest.fixture
def cache(tmp_path, monkeypatch) -> Path:
    monkeypatch.setattr(user_folders.sys, "platform", "linux")
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "cache"))
    return tmp_path / "cache" / "thalweg" / "compiled"


def test_the_folder_is_the_person_s_and_names_version_and_kernels(cache, monkeypatch):
    monkeypatch.delenv("NUMBA_CACHE_DIR")
    keep_compiled()
    assert Path(os.environ["NUMBA_CACHE_DIR"]) == cache / f"{thalweg.__version__}-{kernel_digest()}"
    assert compiled_folder().is_dir()


def test_a_setting_of_the_person_stays(cache, monkeypatch):
    monkeypatch.setenv("NUMBA_CACHE_DIR", "/elsewhere")
    keep_compiled()
    assert os.environ["NUMBA_CACHE_DIR"] == "/elsewhere"
    assert not cache.exists()


def test_a_changed_kernel_gets_another_folder(cache, tmp_path, monkeypatch):
    kernels = tmp_path / "thalweg" / "kernels"
    shutil.copytree(Path(thalweg.__file__).parent / "kernels", kernels, ignore=shutil.ignore_patterns("__pycache__"))
    monkeypatch.setattr(compiled.thalweg, "__file__", str(kernels.parent / "__init__.py"))
    before = kernel_digest()
    with (kernels / "bits.py").open("a") as file:
        file.write("\n")
    assert kernel_digest() != before


def test_folders_of_old_versions_go_but_the_latest_stay(cache):
    for number in range(5):
        (cache / f"0.0.{number}-old").mkdir(parents=True)
        os.utime(cache / f"0.0.{number}-old", (number, number))
    kept = compiled_folder()
    assert {f.name for f in cache.iterdir()} == {kept.name, "0.0.4-old", "0.0.3-old"}


def test_a_home_that_cannot_be_written_gets_a_private_temporary_folder(tmp_path, monkeypatch):
    (tmp_path / "file").touch()
    monkeypatch.setattr(user_folders.sys, "platform", "linux")
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path / "file"))
    one, other = compiled_folder(), compiled_folder()
    assert one != other
    assert stat.S_IMODE(one.stat().st_mode) == 0o700
    assert one.parent != tmp_path


def test_an_installation_that_nobody_can_write_keeps_compiled_code_in_the_folder(cache, tmp_path):
    """A copy of the kernels without a folder for compiled code: the second process compiles nothing."""
    core = tmp_path / "core"
    shutil.copytree(Path(thalweg.__file__).parent, core / "thalweg", ignore=shutil.ignore_patterns("__pycache__"))
    app = Path(compiled.__file__).parents[1]
    (core / "thalweg" / "kernels" / "__pycache__").touch()  # a file in the way holds for every person, root too
    code = (
        f"import sys; sys.path[:0] = [{str(core)!r}, {str(app)!r}]; from thalweg_app.compiled import *; keep_compiled(); said = []\n"
        "with announced(said.append):\n"
        "    import numpy as np; from thalweg.kernels.pauli import encoding_masks; encoding_masks(np.eye(2, dtype=np.uint8))\n"
        "print(said)"
    )
    environment = {k: v for k, v in os.environ.items() if k != "NUMBA_CACHE_DIR"}
    runs = [subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, env=environment, timeout=120) for _ in range(2)]
    assert [run.stdout.strip() for run in runs] == ["[True, False]", "[]"]
    assert list(cache.rglob("*.nbi"))


def test_compiling_is_told_once_for_kernels_that_follow_each_other(monkeypatch):
    monkeypatch.setattr(compiled, "REST", 0.05)
    said: list[bool] = []
    announcer = Announcer(said.append)
    for _ in range(3):
        announcer.begin()
        announcer.begin()
        announcer.end()
        announcer.end()
    assert said == [True]
    deadline = time.monotonic() + 60.0
    while said != [True, False]:
        assert time.monotonic() < deadline
        time.sleep(0.01)


def test_rehearsals_run_all_once_and_the_smallest_ever_after(tmp_path, monkeypatch):
    ran: list[object] = []
    monkeypatch.setenv("NUMBA_CACHE_DIR", str(tmp_path))
    monkeypatch.setattr(rehearsals, "run_quietly", ran.append)
    rehearsals.rehearse()
    assert ran == list(rehearsals.rehearsals())
    ran.clear()
    rehearsals.rehearse()
    assert ran == [next(rehearsals.rehearsals())]
