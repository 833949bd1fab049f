"""What the command line refuses, and how it says so; opening the window from it."""

from __future__ import annotations

from pathlib import Path

import pytest

from thalweg.paths import data_folder

SAMPLES = data_folder("sample_systems")


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["solve"], "Missing argument"),
        (["dissolve"], "No such command"),
        (["solve", "nowhere.xyz"], "There is no file 'nowhere.xyz'"),
        (["solve", "H2", "--encoding", "morse"], "is not one of 'jordan-wigner'"),
        (["solve", "H2", "--basis", "no-such-basis"], "no-such-basis"),
        (["solve", "H2", "--multiplicity", "2"], "Multiplicity 2"),
        (["solve", "H4_square", "--set", "memory_gib=1e-7"], "exceed the budget of 9.97e-08 GiB"),
        (["solve", "H2", "--reference", "1e400*20 + 02"], "too large"),
        (["solve", "ring_8_ising_h1.0", "--set", "system.model.j=1e200"], "largest coefficient"),
        (["solve", "H2", "--depth", "3"], "UCCSD has no setting 'depth'"),
        (["solve", "N2_6e6o", "--basis", "6-31g"], "Integrals has no setting 'basis'"),
        (["solve", "LiH", "--active", "40e,2o"], "40"),
        (["solve", "LiH", "--active", "2e,2o", "--frozen-core"], "exclude each other"),
        (["solve", "H2", "--classical", "dft"], "classical"),
        (["solve", "H2", "--starts", "0"], "starts"),
        (["solve", "H2", "--set", "seed"], "has no value"),
        (["solve", "H2", "--set", "seed=many"], "seed"),
        (["solve", "H2", "--set", "nothing.here=1"], "Unknown setting"),
        (["solve", "H2", "--set", "target.error=1e999"], "target.error"),
        (["solve", "H2", "--save", "none/s.json"], "there is no folder"),
        (["solve", "H2", "--save", "taken"], "is not overwritten"),
        (["solve", "H2", "--json", "none/s.json"], "there is no folder"),
        (["solve", "H2", "--figure", "c.gif"], "png, svg or pdf"),
        (["solve", "taken"], "something else"),
        (["check", "taken"], "taken"),
        (["check", "nowhere"], "no such file"),
        (["check", "H2", "--tolerance", "-1"], "tolerance"),
        (["open", "nowhere"], "There is no file 'nowhere'"),
    ],
)
def test_bad_input_is_one_line_with_status_2(thalweg, words, sentence):
    Path("taken").write_text("something else")
    status, out, err = thalweg(*words, *(["--quiet"] if words[0] in ("solve", "check") and len(words) > 1 else []))
    assert status == 2
    assert out == ""
    assert sentence in err
    assert len(err.splitlines()) == 1
    assert err.rstrip().endswith(".")
    assert Path("taken").read_text() == "something else"
    assert {path.name for path in Path().iterdir()} == {"taken"}


def test_empty_standard_input_is_told(thalweg):
    status, _, err = thalweg("solve", "-", stdin=b" \n")
    assert (status, err) == (2, "Standard input is empty: nothing was piped in. Pipe a geometry in, or give the name of a file.\n")


def test_an_empty_session_has_nothing_to_solve_or_check(thalweg):
    from thalweg.storage.session import Session, save_session

    save_session(Session(), Path("empty.json"))
    assert "empty session" in thalweg("solve", "empty.json")[2]
    assert "nothing to check" in thalweg("check", "empty.json")[2]


def test_a_newer_session_is_neither_read_nor_overwritten(thalweg):
    content = '{"program": "thalweg", "format": 999}'
    Path("new.json").write_text(content)
    for words in (["check", "new.json"], ["solve", "H2", "--save", "new.json"], ["solve", "new.json"]):
        status, _, err = thalweg(*words)
        assert status == 2
        assert "newer" in err
    assert Path("new.json").read_text() == content


# --- defects ------------------------------------------------------------------------------------------------------------


def test_a_defect_is_one_sentence_and_its_traceback_is_in_the_log(thalweg, tmp_path, monkeypatch):
    def broken(*_: object, **__: object) -> None:
        raise ZeroDivisionError("made for this test")

    monkeypatch.setattr("thalweg.study.run.run", broken)
    status, out, err = thalweg("solve", "H2", "--quiet")
    assert status == 3
    assert out == ""
    assert len(err.splitlines()) == 1
    assert "ZeroDivisionError" in err
    log = tmp_path / "state" / "thalweg" / "thalweg.log"
    assert str(log) in err
    assert "made for this test" in log.read_text()


def test_a_lack_of_memory_is_told_as_such(thalweg, monkeypatch):
    def hungry(*_: object, **__: object) -> None:
        raise MemoryError

    monkeypatch.setattr("thalweg.study.run.run", hungry)
    status, _, err = thalweg("solve", "H2", "--quiet")
    assert status == 2
    assert err.startswith("Not enough memory: ")


# --- the window from the terminal ------------------------------------------------------------------------------------------


@pytest.fixture
def opened(monkeypatch) -> list:
    """What the window was asked to open, instead of opening it."""
    import sys
    from types import ModuleType

    calls: list = []
    window = ModuleType("thalweg_app.main")
    window.open_window = lambda arguments: calls.append(arguments) or 0
    monkeypatch.setitem(sys.modules, "thalweg_app.main", window)
    monkeypatch.setenv("QT_QPA_PLATFORM", "offscreen")
    monkeypatch.setattr("thalweg_app.terminal.window.missing_libraries", dict)
    return calls


def test_no_words_open_the_window(thalweg, opened):
    assert thalweg()[0] == 0
    assert opened == [[]]


def test_open_takes_a_file_or_a_sample(thalweg, opened):
    Path("mine.xyz").write_text("1\n\nHe 0 0 0\n")
    assert thalweg("open", "mine.xyz")[0] == 0
    assert thalweg("open", "lih")[0] == 0
    assert opened == [["mine.xyz"], [str(SAMPLES / "LiH.xyz")]]


def test_without_a_display_the_window_is_refused_with_a_way_out(thalweg, opened, monkeypatch):
    for name in ("QT_QPA_PLATFORM", "DISPLAY", "WAYLAND_DISPLAY"):
        monkeypatch.delenv(name, raising=False)
    monkeypatch.setattr("thalweg_app.system_libraries.sys.platform", "linux")
    status, _, err = thalweg()
    assert status == 2
    assert "there is no display" in err
    assert opened == []


def test_a_missing_library_is_named_before_qt_is_loaded(thalweg, opened, monkeypatch):
    monkeypatch.setattr("thalweg_app.terminal.window.missing_libraries", lambda: {"libxcb-cursor.so.0": "libxcb-cursor0"})
    status, _, err = thalweg()
    assert status == 2
    assert "libxcb-cursor.so.0" in err
    assert opened == []
