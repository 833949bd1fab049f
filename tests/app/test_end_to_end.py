"""The real program on a virtual screen: load LiH, run, wait for the verdict, save, reopen, check again. Keeps a screenshot."""

import contextlib
import json
import os
import shutil
import struct
import subprocess
import sys
import time
from pathlib import Path

import pytest
from PySide6.QtGui import QImage

import thalweg
import thalweg_app
from thalweg.paths import data_folder
from thalweg.storage.session import SUFFIX, load_session

OUTPUT = Path(__file__).parents[1] / "output"
PATIENCE = 180  # seconds; the first run compiles
EXACT = -7.88239151  # full CI at 1.5957 angstrom in STO-3G; its source stands in tests/reference/molecular_energies.py
LIH_SAMPLE = data_folder("sample_systems") / "LiH.xyz"


class Screen:
    """A virtual screen with the program on it, driven by xdotool."""

    def __init__(self, folder):
        self._folder = folder
        read, write = os.pipe()
        size = ["-screen", "0", "1280x800x24", "-nolisten", "tcp", "-fbdir", str(folder)]
        self._server = subprocess.Popen(["Xvfb", "-displayfd", str(write), *size], pass_fds=[write], stderr=subprocess.DEVNULL)
        os.close(write)
        with os.fdopen(read) as stream:
            self.display = f":{stream.readline().strip()}"
        self._program = None
        self._log = (folder / "program.log").open("w")

    def start(self, *arguments):
        roots = [str(Path(package.__file__).parents[1]) for package in (thalweg, thalweg_app)]
        places = {name: str(self._folder / name.lower()) for name in ("XDG_CONFIG_HOME", "XDG_DATA_HOME", "XDG_STATE_HOME", "XDG_CACHE_HOME")}
        environment = {**os.environ, **places, "DISPLAY": self.display, "QT_QPA_PLATFORM": "xcb", "PYTHONPATH": os.pathsep.join(roots)}
        self._program = subprocess.Popen([sys.executable, "-m", "thalweg_app", *arguments], env=environment, stdout=self._log, stderr=self._log)

    def wait_for(self, title):
        """The number of the window whose title contains this, with the keyboard on it."""
        end = time.monotonic() + PATIENCE
        while time.monotonic() < end:
            assert self._program.poll() is None, f"the program has ended: {self.log()}"
            found = self._do("search", "--onlyvisible", "--name", title, check=False).stdout.split()
            if found:
                self._do("windowfocus", "--sync", found[-1], check=False)
                return found[-1]
            time.sleep(0.1)
        names = [
            self._do("getwindowname", w, check=False).stdout for w in self._do("search", "--onlyvisible", "--name", ".", check=False).stdout.split()
        ]
        raise AssertionError(f"no window '{title}' within {PATIENCE} s; there are {names}; {self.log()}")

    def press(self, keys):
        self._do("key", "--clearmodifiers", keys)

    def type(self, text):
        self._do("type", "--delay", "8", text)

    def keep(self, name):
        """Saves what the screen shows, from the frame buffer that the server keeps in a file (format: XWDFile.h of X11)."""
        time.sleep(1.0)  # the layout settles after the title has changed
        data = (self._folder / "Xvfb_screen0").read_bytes()
        words = struct.unpack(">25I", data[:100])
        header_size, width, height, bytes_per_line, colours = words[0], words[4], words[5], words[12], words[19]
        begin = header_size + 12 * colours
        image = QImage(data[begin : begin + height * bytes_per_line], width, height, bytes_per_line, QImage.Format.Format_RGB32)
        OUTPUT.mkdir(exist_ok=True)
        assert image.save(str(OUTPUT / name))
        return image

    def quit(self):
        self.press("ctrl+q")
        return self._program.wait(timeout=30)

    def log(self):
        self._log.flush()
        return (self._folder / "program.log").read_text()[-3000:]

    def close(self):
        for process in (self._program, self._server):
            if process is not None and process.poll() is None:
                process.terminate()
                with contextlib.suppress(subprocess.TimeoutExpired):
                    process.wait(timeout=10)
        self._log.close()

    def _do(self, *words, check=True):
        environment = {**os.environ, "DISPLAY": self.display}
        return subprocess.run(["xdotool", *words], env=environment, capture_output=True, text=True, check=check, timeout=60)


@pytest.fixture
def screen(tmp_path):
    missing = [name for name in ("Xvfb", "xdotool") if shutil.which(name) is None]
    if missing:
        pytest.fail(f"The end-to-end test needs {', '.join(missing)}: install the packages xvfb and xdotool.")
    made = Screen(tmp_path)
    yield made
    made.close()


def test_lih_from_file_to_answer_saved_reopened_and_checked(screen, tmp_path):
    saved = tmp_path / f"lih{SUFFIX}"
    screen.start("open", str(LIH_SAMPLE))
    screen.wait_for("untitled.*Thalweg")
    screen.press("ctrl+r")
    screen.wait_for("run 1: reached")
    shown = screen.keep("lih_finished.png")
    assert len({shown.pixel(x, y) for x in range(0, 1280, 9) for y in range(0, 800, 9)}) > 20  # curves, text and washes, not a blank screen
    screen.press("ctrl+s")
    screen.wait_for("Save the session")
    screen.press("ctrl+a")
    screen.type(str(saved))
    screen.press("Return")
    screen.wait_for("lih .*run 1: reached")
    assert screen.quit() == 0, screen.log()
    _holds_the_answer(saved)

    screen.start("open", str(saved))
    screen.wait_for("lih .*run 1: reached")
    screen.press("ctrl+shift+r")
    screen.wait_for("run 1: repeats")
    screen.keep("lih_checked.png")
    assert screen.quit() == 0, screen.log()


def _holds_the_answer(path):
    session = load_session(path)
    result = session.runs[0].result
    assert result.exact_energy == pytest.approx(EXACT, abs=1e-7)
    assert result.reached_target
    assert 0 <= result.error < 1.1e-5
    assert json.loads(path.read_text())["program"] == "thalweg"
