"""Scans in sessions: they come back as they were, under numbers of their own."""

import pytest

from thalweg.errors import StudyError
from thalweg.storage.session import Session, load_session, save_session
from thalweg.study.path import StretchPath
from thalweg.study.scan_result import CurvePoint, ScanResult
from thalweg.study.scan_spec import Literature, ScanSpec


@pytest.fixture
def scan(result, spec) -> ScanResult:
    wanted = ScanSpec(study=spec, path=StretchPath(bonds="1-2"), points=(0.5, 0.7, 0.1 + 0.2), literature=Literature(r_e=0.7, source="typed"))
    points = (
        CurvePoint(index=0, coordinate=0.1 + 0.2, result=result, flags=("retried",), notes=("mean-field-branch: told",)),
        CurvePoint(index=1, coordinate=0.5, result=None, failure="It cannot be: for a reason. Do otherwise.", flags=("failed",)),
    )
    return ScanResult(
        label="invented",
        axis="Length",
        unit="angstrom",
        energy_unit="hartree",
        target_error=1e-3,
        points=points,
        finished=False,
        npe=1e-17,
        spec=wanted,
    )


def test_a_scan_comes_back_to_the_last_digit(scan, spec, tmp_path):
    session = Session(name="curves", setup=spec).with_scan(scan)
    save_session(session, tmp_path / "s.json")
    back = load_session(tmp_path / "s.json")
    assert back.scans == session.scans
    assert back.scans[0].result.points[0].coordinate == 0.1 + 0.2
    assert back.scans[0].result.spec.literature.r_e == 0.7


def test_a_scan_that_goes_on_takes_its_own_place_and_a_new_one_the_next_number(scan):
    more = scan.model_copy(update={"finished": True})
    session = Session().with_scan(scan).with_scan(scan).with_scan(more, number=1)
    assert [(s.number, s.result.finished) for s in session.scans] == [(1, True), (2, False)]
    assert [s.number for s in session.with_scan(scan, number=7).scans] == [1, 2, 3]


def test_two_scans_of_one_number_are_damage(scan, tmp_path):
    session = Session().with_scan(scan)
    save_session(session.model_copy(update={"scans": session.scans * 2}), tmp_path / "s.json")
    with pytest.raises(StudyError, match="two scans carry the same number"):
        load_session(tmp_path / "s.json")


def test_a_session_without_scans_is_read_as_before(tmp_path):
    data = Session().model_dump_json(exclude={"scans"})
    (tmp_path / "old.json").write_text(data)
    assert load_session(tmp_path / "old.json").scans == ()
