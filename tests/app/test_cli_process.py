"""The command as a process: what it loads, what a pipe sees, what Ctrl-C leaves behind."""

from __future__ import annotations

import json
import os
import pty
import select
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

COMMAND = [sys.executable, "-m", "thalweg_app"]
#: A search that would take hours: many steps of a method without gradients, and no rule that ends it soon.
ENDLESS = ["solve", "BeH2", "--optimizer", "gradient-descent", "--set", "optimizer.step=1e-6", "--set", "optimizer.max_iterations=100000000"]
ENDLESS += ["--set", "stop.evaluations=1000000000", "--set", "stop.gradient=0"]
PATIENCE = 90.0


def start(words: list[str], folder: Path, **streams) -> subprocess.Popen:
    return subprocess.Popen([*COMMAND, *words], cwd=folder, env=environment(), text=True, **streams)


def environment() -> dict[str, str]:
    return {**os.environ, "OMP_NUM_THREADS": "1", "PYTHONFAULTHANDLER": "1"}


def wait_for_line(stream, beginning: str) -> None:
    deadline = time.monotonic() + PATIENCE
    for line in iter(stream.readline, ""):
        if line.startswith(beginning):
            return
        assert time.monotonic() < deadline
    raise AssertionError(f"the process ended before it said '{beginning}'")


def test_help_loads_no_numerics_and_no_window():
    code = "import sys; from thalweg_app.cli import main; main(['--help']); print(*sorted({m.split('.')[0] for m in sys.modules}), file=sys.stderr)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=PATIENCE)
    assert "Usage: thalweg" in done.stdout
    assert not {"numpy", "numba", "pyscf", "openfermion", "PySide6", "matplotlib", "scipy"} & set(done.stderr.split())


def test_a_pipe_sees_json_alone_on_standard_output_and_plain_lines_beside_it(tmp_path):
    done = subprocess.run(
        [*COMMAND, "solve", "-", "--json", "-"], input="H 0 0 0\nH 0 0 0.74\n", capture_output=True, text=True, cwd=tmp_path, timeout=PATIENCE
    )
    assert done.returncode == 0
    assert json.loads(done.stdout)["reached_target"] is True
    assert "Minimising" in done.stderr
    assert "\x1b" not in done.stderr + done.stdout


def test_a_reader_that_leaves_early_is_no_defect(tmp_path):
    with start(["solve", "H2", "--json", "-", "--quiet"], tmp_path, stdout=subprocess.PIPE, stderr=subprocess.PIPE) as process:
        process.stdout.close()
        err = process.stderr.read()
    assert process.returncode not in (0, 2, 3)
    assert err == ""


@pytest.mark.parametrize(("number", "status"), [(signal.SIGINT, 130), (signal.SIGTERM, 143)])
def test_a_stopped_study_prints_and_saves_the_best_so_far(tmp_path, number, status):
    words = [*ENDLESS, "--json", "-", "--save", "kept.json"]
    with start(words, tmp_path, stdout=subprocess.PIPE, stderr=subprocess.PIPE) as process:
        wait_for_line(process.stderr, "iteration ")
        time.sleep(0.3)
        process.send_signal(number)
        out, err = process.communicate(timeout=PATIENCE)
    assert process.returncode == status
    answer = json.loads(out)
    assert answer["stop_reason"] == "stopped-by-person"
    assert answer["energy"] <= answer["reference_energy"]
    assert answer["reached_target"] is False
    assert "Stopping with the best so far" in err
    saved = json.loads((tmp_path / "kept.json").read_text())
    assert saved["runs"][0]["result"]["energy"] == answer["energy"]


def test_a_stop_before_the_first_energy_keeps_nothing_and_says_so(tmp_path):
    with start(["solve", "H2", "--basis", "cc-pvdz", "--save", "kept.json"], tmp_path, stdout=subprocess.PIPE, stderr=subprocess.PIPE) as process:
        wait_for_line(process.stderr, "Coordinates read")
        process.send_signal(signal.SIGINT)
        out, err = process.communicate(timeout=PATIENCE)
    if "Minimising" not in err:  # otherwise the study was faster than the signal, which is right as well
        assert (process.returncode, out) == (130, "")
        assert "nothing to keep" in err or "Stopped before anything" in err
        assert not (tmp_path / "kept.json").exists()


def test_a_screen_gets_a_bar_with_the_time_left_and_the_cursor_back(tmp_path):
    pid, terminal = pty.fork()
    if pid == 0:
        os.chdir(tmp_path)
        os.environ.update(environment(), TERM="xterm", COLUMNS="150")
        os.execv(COMMAND[0], [*COMMAND, *ENDLESS])
    shown = read_terminal(terminal, until="left")
    os.write(terminal, b"\x03")
    shown += read_terminal(terminal)
    assert os.waitstatus_to_exitcode(os.waitpid(pid, 0)[1]) == 130
    assert "iteration " in shown
    assert "about " in shown
    assert "Not converged: " in shown
    assert shown.count("\x1b[?25l") == shown.count("\x1b[?25h")


def read_terminal(terminal: int, until: str = "") -> str:
    """What the program shows, up to a word or to its end."""
    shown, deadline = "", time.monotonic() + PATIENCE
    while time.monotonic() < deadline:
        if not select.select([terminal], [], [], 1.0)[0]:
            continue
        try:
            piece = os.read(terminal, 65536)
        except OSError:  # the other end is closed
            return shown
        if not piece:
            return shown
        shown += piece.decode("utf-8", "replace")
        if until and until in shown:
            return shown
    raise AssertionError(f"nothing more came; so far: {shown[-500:]}")
