"""Sessions come back as they were saved, and a bad file is a sentence that changes nothing."""

from __future__ import annotations

import json
import os
from pathlib import Path

import jsonschema
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from thalweg.errors import StudyError
from thalweg.storage import files
from thalweg.storage.migrations import CURRENT_FORMAT, migrate
from thalweg.storage.schema import schema_path, schema_text
from thalweg.storage.session import Run, Session, is_session, load_session, parse_session, save_session


@pytest.fixture
def session(spec, result) -> Session:
    return Session(name="Brücke", setup=spec).with_result(result, note="first: “quoted”").with_result(result)


def test_a_saved_session_comes_back_equal_to_the_last_bit(tmp_path, session):
    path = tmp_path / "one.thalweg.json"
    save_session(session, path)
    back = load_session(path)
    assert back == session
    assert back.runs[0].result.final_parameters == session.runs[0].result.final_parameters
    assert str(back.runs[0].result.start_parameters[1]) == "-0.0"
    assert back.runs[0].result.gradient_norm == 5e-324
    assert back.setup == session.setup
    assert hash(back.setup) == hash(session.setup)


def test_runs_are_numbered_on_and_a_number_is_not_given_twice(session, result):
    assert [run.number for run in session.runs] == [1, 2]
    kept = session.model_copy(update={"runs": session.runs[1:]})
    assert [run.number for run in kept.with_result(result).runs] == [2, 3]
    with pytest.raises(ValueError, match="same number"):
        Session(runs=(Run(number=1, result=result), Run(number=1, result=result)))


def test_a_saved_session_obeys_the_published_schema(tmp_path, session):
    path = tmp_path / "one.thalweg.json"
    save_session(session, path)
    schema = json.loads(schema_path().read_text())
    jsonschema.Draft202012Validator.check_schema(schema)
    jsonschema.validate(json.loads(path.read_text()), schema)
    broken = json.loads(path.read_text())
    broken["runs"][0]["result"]["energy"] = "low"
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(broken, schema)


def test_the_published_schema_is_that_of_the_models():
    assert schema_path().read_text() == schema_text(), "run: .venv/bin/python -m thalweg.storage.schema"


def test_a_name_that_is_no_text_does_not_keep_a_session_from_being_saved(tmp_path, session):
    odd = session.model_copy(update={"name": os.fsdecode(b"br\xfccke")})
    save_session(odd, tmp_path / "s.json")
    back = load_session(tmp_path / "s.json")
    assert back.name == "br?cke"
    assert back.runs == session.runs


@pytest.mark.parametrize("name", ["", os.fsdecode(b"\xff")])
@pytest.mark.parametrize("value", [float("nan"), float("inf"), -float("inf")])
def test_no_infinite_number_becomes_an_empty_one(tmp_path, session, result, value, name):
    trace = result.trace.model_copy(update={"energy": (-1.0, value)})
    start = result.starts[0].model_copy(update={"trace": trace})
    with pytest.raises(StudyError, match=r"starts\.0\.trace\.energy\.1 is not a finite number"):
        save_session(session.model_copy(update={"name": name}).with_result(result.model_copy(update={"starts": (start,)})), tmp_path / "s.json")
    assert not (tmp_path / "s.json").exists()


def test_a_note_may_speak_of_such_numbers(tmp_path, session, result):
    noted = session.with_result(result, note="energy:NaN, [Infinity]")
    save_session(noted, tmp_path / "s.json")
    assert load_session(tmp_path / "s.json").runs[-1].note == "energy:NaN, [Infinity]"


def test_a_figure_that_is_not_finite_is_refused_and_the_old_file_stays(tmp_path, session, result):
    path = tmp_path / "one.thalweg.json"
    save_session(session, path)
    before = path.read_bytes()
    bad = result.model_copy(update={"system_facts": {"nested": [1.0, float("nan")]}})
    with pytest.raises(StudyError, match=r"runs\.2\.result\.system_facts\.nested\.1 is not a finite number"):
        save_session(session.with_result(bad), path)
    assert path.read_bytes() == before


def test_numpy_figures_among_the_facts_are_saved_as_plain_numbers(tmp_path, result):
    path = tmp_path / "one.thalweg.json"
    facts = {"count": np.int64(3), "list": np.array([0.1, 0.2])}
    save_session(Session().with_result(result.model_copy(update={"system_facts": facts})), path)
    assert load_session(path).runs[0].result.system_facts == {"count": 3, "list": [0.1, 0.2]}


def test_an_interrupted_write_leaves_the_old_file_and_no_remains(tmp_path, session, monkeypatch):
    path = tmp_path / "one.thalweg.json"
    save_session(session, path)
    before = path.read_bytes()

    def full(descriptor: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(files.os, "fsync", full)
    with pytest.raises(StudyError, match="no space left on device"):
        save_session(session, path)
    assert path.read_bytes() == before
    assert os.listdir(tmp_path) == [path.name]


def test_saving_through_a_link_keeps_the_link_and_the_permissions(tmp_path, session):
    real, link = tmp_path / "real.json", tmp_path / "link.json"
    real.write_text("{}")
    real.chmod(0o640)
    link.symlink_to(real)
    save_session(session, link)
    assert link.is_symlink()
    assert real.stat().st_mode & 0o777 == 0o640
    assert load_session(real) == session


def test_saving_into_a_missing_folder_is_a_sentence(tmp_path, session):
    with pytest.raises(StudyError, match="no such file or directory"):
        save_session(session, tmp_path / "none" / "one.json")
    with pytest.raises(StudyError, match="there is no folder"):
        files.ensure_writable(tmp_path / "none" / "one.json")
    with pytest.raises(StudyError, match="it is a folder"):
        files.ensure_writable(tmp_path)


def _saved(session: Session, tmp_path: Path) -> dict:
    path = tmp_path / "valid.json"
    save_session(session, path)
    return json.loads(path.read_text())


@pytest.mark.parametrize(
    ("content", "sentence"),
    [
        (b"", "not complete JSON"),
        (b"\xff\xfe{\x00}\x00", "not UTF-8"),
        (b"[1, 2]", "one JSON object"),
        (b'{"format": 1}', "does not carry the mark"),
        (b'{"program": "another", "format": 1}', "does not carry the mark"),
        (b'{"program": "thalweg"}', "no format number"),
        (b'{"program": "thalweg", "format": true}', "no format number"),
        (b'{"program": "thalweg", "format": 999}', "newer version"),
        (b'{"program": "thalweg", "format": 1, "runs": [1]}', "runs.0"),
        (b'{"program": "thalweg", "format": 1, "extra": NaN}', "NaN"),
        (b'{"program": "thalweg", "format": 1, "extra": 1e999}', "too large"),
        (b'{"program": "thalweg", "format": 1, "unknown": 1}', "unknown"),
        (b"[" * 200_000, "nested too deeply"),
        (b'{"a":' * 200_000, "nested too deeply"),
        (b"2\nH2\nH 0 0 0\nH 0 0 1\n", "not complete JSON"),
    ],
)
def test_a_bad_file_is_a_sentence_and_stays_as_it_was(tmp_path, content, sentence):
    path = tmp_path / "bad.json"
    path.write_bytes(content)
    with pytest.raises(StudyError, match=sentence):
        load_session(path)
    assert path.read_bytes() == content


def test_every_truncation_of_a_session_is_a_sentence(tmp_path, session):
    text = json.dumps(_saved(session, tmp_path)).encode()
    for end in range(0, len(text) - 1, 97):
        with pytest.raises(StudyError):
            parse_session(text[:end], "cut.json")


@settings(max_examples=150, deadline=None)
@given(st.binary(max_size=200) | st.recursive(st.none() | st.floats() | st.text(), st.lists, max_leaves=5).map(lambda x: json.dumps(x).encode()))
def test_nothing_but_a_session_or_a_sentence_comes_of_any_bytes(content):
    try:
        parse_session(content, "any.json")
    except StudyError:
        return
    raise AssertionError("bytes without the program's mark were taken for a session")


def test_a_file_over_the_limit_is_refused_unread(tmp_path, monkeypatch):
    monkeypatch.setattr(files, "MAX_READ_BYTES", 1000)
    path = tmp_path / "big.json"
    path.write_bytes(b" " * 1001)
    with pytest.raises(StudyError, match="the limit is"):
        load_session(path)


def test_a_missing_file_and_a_folder_are_sentences(tmp_path):
    with pytest.raises(StudyError, match="no such file"):
        load_session(tmp_path / "none.json")
    with pytest.raises(StudyError, match="it is a folder"):
        load_session(tmp_path)


def test_a_session_is_told_from_other_files(tmp_path, session):
    assert is_session(json.dumps(_saved(session, tmp_path)).encode())
    assert is_session(b'{"program": "thalweg", "format": 999}')
    assert not is_session(b"2\n\nH 0 0 0\nH 0 0 1\n")
    assert not is_session(b"\x89HDF\r\n")


def test_older_formats_come_up_step_by_step():
    steps = {
        1: lambda data: {"program": data["program"], "title": data["titel"]},
        2: lambda data: {"program": data["program"], "name": data["title"].upper()},
    }
    old = {"program": "thalweg", "format": 1, "titel": "old"}
    assert migrate(old, steps, current=3) == {"program": "thalweg", "name": "OLD", "format": 3}
    assert old == {"program": "thalweg", "format": 1, "titel": "old"}
    with pytest.raises(StudyError, match="Format 2 cannot be read"):
        migrate(old, {1: steps[1]}, current=3)


def test_the_present_format_needs_no_step():
    assert migrate({"format": CURRENT_FORMAT}) == {"format": CURRENT_FORMAT}
