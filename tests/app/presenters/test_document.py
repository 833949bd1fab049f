import os

import pytest
import studies
from fake_starter import FakeRecent

from thalweg.errors import StudyError
from thalweg.storage.session import SUFFIX, load_session
from thalweg_app.presenters.document import Document, Recovery
from thalweg_app.presenters.history import History
from thalweg_app.presenters.ledger import Ledger
from thalweg_app.presenters.scan_control import ScanControl
from thalweg_app.presenters.setup import SetupEditing


class Desk:
    def __init__(self):
        self.history, self.recent = History(), FakeRecent()
        self.setup = SetupEditing(self.history, studies.study())
        self.ledger = Ledger(self.history)
        self.document = Document(self.setup, self.ledger, ScanControl(None, lambda: None), self.history, self.recent)


@pytest.fixture
def desk():
    return Desk()


def test_a_new_document_is_clean_and_unnamed(desk):
    assert not desk.document.is_dirty
    assert desk.document.name == "untitled"


def test_edits_and_runs_mark_it_and_saving_clears_the_mark(desk, tmp_path):
    desk.setup.edit("seed", "7")
    assert desk.document.is_dirty
    assert not desk.document.has_unsaved_results
    desk.ledger.add(studies.result())
    assert desk.document.has_unsaved_results
    desk.document.save(tmp_path / "lih")
    assert not desk.document.is_dirty


def test_undo_back_to_the_saved_state_clears_the_mark(desk):
    desk.setup.edit("seed", "7")
    desk.history.undo()
    assert not desk.document.is_dirty


def test_a_note_marks_it(desk, tmp_path):
    desk.ledger.add(studies.result())
    desk.document.save(tmp_path / "a")
    desk.ledger.annotate(1, "x")
    assert desk.document.is_dirty


def test_the_ending_is_added_and_the_name_is_the_file_s(desk, tmp_path):
    path = desk.document.save(tmp_path / "lih")
    assert path.name == "lih" + SUFFIX
    assert desk.document.name == "lih"


def test_what_is_saved_is_what_is_opened(desk, tmp_path):
    desk.ledger.add(studies.result())
    desk.ledger.annotate(1, "first")
    path = desk.document.save(tmp_path / "lih")
    other = Desk()
    other.document.take(load_session(path), path)
    assert other.setup.spec == desk.setup.spec
    assert other.ledger.runs == desk.ledger.runs
    assert other.document.name == "lih"
    assert not other.document.is_dirty
    assert other.history.undo_text == ""


def test_recent_sessions_are_remembered_newest_first_without_doubles(desk, tmp_path):
    for name in ("a", "b", "a"):
        desk.document.save(tmp_path / name)
    assert [os.path.basename(p) for p in desk.document.recent] == ["a" + SUFFIX, "b" + SUFFIX]


def test_a_failed_save_keeps_the_mark(desk, tmp_path):
    desk.setup.edit("seed", "7")
    with pytest.raises(StudyError):
        desk.document.save(tmp_path / "missing" / "a")
    assert desk.document.is_dirty
    assert desk.document.path is None


def test_a_new_session_empties_the_ledger_and_keeps_the_set_up(desk):
    desk.setup.edit("seed", "7")
    desk.ledger.add(studies.result())
    desk.document.start_new()
    assert not desk.ledger.runs
    assert desk.setup.spec.seed == 7
    assert not desk.document.is_dirty


def test_recovery_keeps_an_unsaved_session_and_finds_it_after_a_crash(desk, tmp_path):
    desk.ledger.add(studies.result())
    Recovery(tmp_path, process=999_999_999).keep(desk.document)  # no process has this number
    found = Recovery(tmp_path).left_behind()
    assert len(found) == 1
    other = Desk()
    other.document.restore(Recovery.read(found[0]))
    assert other.ledger.runs == desk.ledger.runs
    assert other.document.is_dirty
    assert "recovered" in other.document.name


def test_copies_of_living_processes_are_left_alone(desk, tmp_path):
    desk.ledger.add(studies.result())
    Recovery(tmp_path, process=os.getppid()).keep(desk.document)
    assert Recovery(tmp_path).left_behind() == []


def test_nothing_is_kept_of_a_saved_session(desk, tmp_path):
    recovery = Recovery(tmp_path)
    desk.ledger.add(studies.result())
    recovery.keep(desk.document)
    assert len(list(tmp_path.iterdir())) == 1
    desk.document.mark_pristine()
    recovery.keep(desk.document)
    assert list(tmp_path.iterdir()) == []


def test_a_damaged_copy_is_passed_over(tmp_path):
    broken = tmp_path / f"999999999{SUFFIX}"
    broken.write_text("{")
    assert Recovery.read(broken) is None
