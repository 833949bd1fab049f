"""The set-up script: what it decides, without installing anything."""

from __future__ import annotations

import importlib.util
import subprocess
import sys
from pathlib import Path
from types import ModuleType, SimpleNamespace

import pytest

TOP = Path(__file__).resolve().parents[1]


@pytest.fixture
def start(tmp_path, monkeypatch) -> ModuleType:
    """The script as a module, with its environment moved to an empty folder and every command recorded instead of run."""
    spec = importlib.util.spec_from_file_location("start_under_test", TOP / "resources" / "start.py")
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    module.VENV = tmp_path / ".venv"
    module.PYTHON = module.VENV / "bin" / "python"
    module.STAMP = module.VENV / "thalweg-stamp"
    module.commands = []

    def record(command, **options):
        module.commands.append([str(word) for word in command])
        if "venv" in command:
            module.PYTHON.parent.mkdir(parents=True, exist_ok=True)
            module.PYTHON.touch()
        return SimpleNamespace(returncode=module.status, stdout="output of the command")

    module.status = 0
    monkeypatch.setattr(module.subprocess, "run", record)
    monkeypatch.setattr(module, "replace_by", lambda arguments: module.commands.append(["replace", *arguments]) or 0)
    return module


def system(display: bool = False, missing: dict | None = None) -> SimpleNamespace:
    return SimpleNamespace(
        has_display=lambda: display, missing_libraries=lambda: missing or {}, install_line=lambda packages: "sudo apt-get " + " ".join(packages)
    )


def use_system(start: ModuleType, monkeypatch, **facts) -> None:
    monkeypatch.setattr(start, "load_system_libraries", lambda: system(**facts))
    monkeypatch.setattr(start, "missing_programs", list)


def test_the_first_start_makes_the_environment_and_installs_the_checkout_into_it(start, monkeypatch):
    use_system(start, monkeypatch)
    assert start.main(["solve", "LiH"]) == 0
    venv, pip, kernels, program = start.commands
    assert venv[1:3] == ["-m", "venv"]
    assert pip[0] == str(start.PYTHON)
    assert pip[-2:] == ["--editable", str(TOP)]
    assert kernels == [str(start.PYTHON), "-m", "thalweg_app.rehearsals"]
    assert program == ["replace", "-m", "thalweg_app", "solve", "LiH"]


def test_the_second_start_installs_nothing(start, monkeypatch):
    use_system(start, monkeypatch)
    start.main(["samples"])
    start.commands.clear()
    start.main(["samples"])
    assert start.commands == [["replace", "-m", "thalweg_app", "samples"]]


def test_tests_need_more_than_the_program_and_bring_it_along(start, monkeypatch):
    use_system(start, monkeypatch)
    start.main(["samples"])
    start.commands.clear()
    assert start.main(["--tests", "-k", "storage"]) == 0
    pip, *steps = start.commands[1:]
    assert pip[-1] == f"{TOP}[test]"
    assert [step[2] for step in steps] == ["ruff", "ruff", "mypy", "pytest"]
    assert steps[-1][3:] == ["-n", "2", "-k", "storage"]
    start.commands.clear()
    start.main(["samples"])
    assert start.commands == [["replace", "-m", "thalweg_app", "samples"]]


def test_changed_dependencies_are_installed_again(start, monkeypatch):
    use_system(start, monkeypatch)
    start.main(["samples"])
    start.commands.clear()
    monkeypatch.setattr(start, "stamp_text", lambda: "another")
    start.main(["samples"])
    assert any("pip" in command for command in start.commands)


def test_a_failed_installation_is_a_sentence_and_leaves_no_stamp(start, monkeypatch):
    use_system(start, monkeypatch)
    monkeypatch.setattr(start, "make_environment", lambda: start.VENV.mkdir())
    start.status = 1
    with pytest.raises(SystemExit, match="could not be installed"):
        start.main(["samples"])
    assert not start.STAMP.exists()


def test_one_failing_step_fails_the_tests_and_the_others_still_run(start, monkeypatch, capsys):
    use_system(start, monkeypatch)
    monkeypatch.setattr(start, "install", lambda tests: None)
    start.status = 1
    assert start.main(["--tests"]) == 1
    assert len(start.commands) == 4
    assert "Failed: formatter, linter, types, tests" in capsys.readouterr().err


def test_with_a_display_the_window_opens_with_a_sample(start, monkeypatch):
    use_system(start, monkeypatch, display=True)
    start.main([])
    assert start.commands[-1] == ["replace", "-m", "thalweg_app", "open", str(TOP / "sample_systems" / "LiH.xyz")]


def test_without_a_display_the_sample_study_runs_in_the_terminal(start, monkeypatch, tmp_path, capsys):
    use_system(start, monkeypatch)
    monkeypatch.chdir(tmp_path)
    called = []
    monkeypatch.setattr(start.subprocess, "call", lambda command: called.append(command) or 0)
    assert start.main([]) == 0
    assert called[0][1:5] == ["-m", "thalweg_app", "solve", "LiH"]
    assert {"--save", "--figure"} <= set(called[0])
    assert "no display" in capsys.readouterr().out


def test_missing_packages_are_installed_by_root_without_questions(start, monkeypatch):
    monkeypatch.setattr(start.os, "geteuid", lambda: 0)
    start.install_packages(system(), ["libegl1", "xvfb"])
    assert start.commands == [["apt-get", "update", "-q"], ["apt-get", "install", "-y", "-q", "--no-install-recommends", "libegl1", "xvfb"]]


def test_missing_packages_stop_anyone_else_with_the_exact_line(start, monkeypatch):
    monkeypatch.setattr(start.os, "geteuid", lambda: 1000)
    with pytest.raises(SystemExit, match="sudo apt-get libegl1"):
        start.install_packages(system(), ["libegl1"])
    assert start.commands == []


def test_a_system_without_apt_is_told_the_names(start):
    without_apt = SimpleNamespace(install_line=lambda packages: "")
    with pytest.raises(SystemExit, match="names of Debian packages"):
        start.install_packages(without_apt, ["libegl1"])


def test_a_python_without_the_venv_module_gets_its_package(start, monkeypatch):
    use_system(start, monkeypatch)
    monkeypatch.setattr(start.importlib.util, "find_spec", lambda name: None)
    monkeypatch.setattr(start.os, "geteuid", lambda: 1000)
    with pytest.raises(SystemExit, match=rf"python{sys.version_info[0]}\.{sys.version_info[1]}-venv"):
        start.make_environment()


def test_an_unfit_python_is_told_which_ones_fit(start, monkeypatch):
    monkeypatch.setattr(start.sys, "version_info", (3, 9, 0))
    monkeypatch.setattr(start.shutil, "which", lambda name: None)
    with pytest.raises(SystemExit, match=r"3\.11, 3\.12 or 3\.13: this is Python 3\.9"):
        start.find_python()


def test_the_gate_calls_exactly_the_documented_command():
    lines = (TOP / ".ci" / "run").read_text().splitlines()
    assert "python3 resources/start.py --tests" in lines
    assert subprocess.run(["bash", "-n", TOP / ".ci" / "run"], check=False).returncode == 0


def test_the_libraries_that_qt_needs_are_found_or_named(monkeypatch):
    from thalweg_app import system_libraries

    monkeypatch.setattr(system_libraries.sys, "platform", "linux")
    monkeypatch.setattr(system_libraries, "_loads", lambda name: name != "libxcb-cursor.so.0")
    assert system_libraries.missing_libraries() == {"libxcb-cursor.so.0": "libxcb-cursor0"}
    monkeypatch.setattr(system_libraries.shutil, "which", lambda name: "/usr/bin/apt-get")
    assert system_libraries.install_line(["libxcb-cursor0"]).endswith("libxcb-cursor0")
    monkeypatch.setattr(system_libraries.sys, "platform", "darwin")
    assert system_libraries.missing_libraries() == {}


@pytest.mark.parametrize(
    ("variables", "expected"), [({}, False), ({"DISPLAY": ":0"}, True), ({"WAYLAND_DISPLAY": "w"}, True), ({"DISPLAY": ""}, False)]
)
def test_a_display_is_told_by_the_environment(variables, expected, monkeypatch):
    from thalweg_app import system_libraries

    for name in ("DISPLAY", "WAYLAND_DISPLAY", "QT_QPA_PLATFORM"):
        monkeypatch.delenv(name, raising=False)
    for name, value in variables.items():
        monkeypatch.setenv(name, value)
    monkeypatch.setattr(system_libraries.sys, "platform", "linux")
    assert system_libraries.has_display() is expected
