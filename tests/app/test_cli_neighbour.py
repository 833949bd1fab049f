"""Starts at the parameters of a run of a session, from the command line."""

from __future__ import annotations

import json

import pytest

from thalweg.storage.session import load_session
from thalweg.study.diagnosis_result import Curvature, LandscapeResult
from thalweg.study.result import StudyResult


@pytest.fixture
def session(thalweg, tmp_path):
    """Run 1 of UCCD and run 2 of UCCSD, both of a small hydride."""
    for ansatz in ("uccd", "uccsd"):
        assert thalweg("solve", "H2", "--basis", "6-31g", "--ansatz", ansatz, "--save", "s.json", "--quiet")[0] == 0
    return load_session(tmp_path / "s.json")


def solved(thalweg, *words: str) -> StudyResult:
    status, out, err = thalweg("solve", "H2", "--basis", "6-31g", *words, "--json", "-", "--quiet")
    assert status == 0, err
    return StudyResult.model_validate(json.loads(out))


def test_a_search_starts_at_the_last_run_of_a_session_or_at_the_one_named(thalweg, session):
    last, first = (solved(thalweg, "--neighbour", name) for name in ("s.json", "s.json:1"))
    assert last.start_parameters == session.runs[1].result.final_parameters
    assert last.iterations <= 1
    assert first.trace.energy[0] == pytest.approx(session.runs[0].result.energy, abs=1e-10)
    assert first.spec.neighbour.source == "run 1 of s.json, H2, 6-31G, UCCD"
    assert any("begin at those of run 1 of s.json" in text for text in first.remarks)


def test_what_is_taken_over_is_told_before_and_after(thalweg, session):
    status, out, _ = thalweg("inspect", "H2", "--basis", "6-31g", "--neighbour", "s.json:1", "--quiet")
    assert status == 0
    assert "parameters begin at those of run 1 of s.json, H2, 6-31G, UCCD, the others at zero." in " ".join(out.split())
    _, out, _ = thalweg("solve", "H2", "--basis", "6-31g", "--neighbour", "s.json:1", "--quiet")
    assert "parameters begin at those of run 1 of s.json" in " ".join(out.split())


def test_every_point_of_a_curve_may_start_there(thalweg, session):
    words = ["scan", "H2", "--basis", "6-31g", "--neighbour", "s.json", "--points", "0.7,0.8", "--json", "-", "--quiet"]
    status, out, err = thalweg(*words)
    assert status == 0, err
    assert json.loads(out)["spec"]["study"]["neighbour"]["source"].startswith("run 2 of s.json")


def test_start_neighbour_says_the_same_and_none_leaves_it_out(thalweg, session):
    named = solved(thalweg, "--neighbour", "s.json", "--start", "neighbour")
    assert named.spec.neighbour.source.startswith("run 2 of s.json")
    assert named.spec.ansatz.start == "zero"
    assert thalweg("solve", "s.json", "--neighbour", "s.json:1", "--save", "t.json", "--quiet")[0] == 0
    for words, kept in ((["t.json"], True), (["t.json", "--start", "neighbour"], True), (["t.json", "--neighbour", "none"], False)):
        status, out, _ = thalweg("solve", *words, "--json", "-", "--quiet")
        assert status == 0
        assert bool(json.loads(out)["spec"]["neighbour"]["parameters"]) is kept


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["--neighbour", "nowhere.json"], "nowhere.json holds no runs: there is no file of this name"),
        (["--neighbour", "nowhere.json:2"], "nowhere.json holds no runs: there is no file of this name"),
        (["--neighbour", "atoms.xyz"], "atoms.xyz holds no runs: it is not a session"),
        (["--neighbour", "empty.json"], "empty.json holds no runs: nothing was run"),
        (["--neighbour", "s.json:7"], "There is no run 7 in s.json: the session holds runs 1, 2. Give one of these."),
        (["--start", "neighbour"], "--start neighbour does not say which run"),
        (["--neighbour", "s.json", "--ansatz", "hardware-efficient"], "The search cannot start from run 2 of s.json"),
        (["--neighbour", "s.json", "--ansatz", "adaptive"], "The pool `spin-adapted` has no operator"),
        (["--neighbour", "s.json", "--set", "continuation=4"], "Continuation cannot start from run 2 of s.json"),
    ],
)
def test_what_is_no_start_is_one_sentence_and_status_two(thalweg, session, tmp_path, words, sentence):
    (tmp_path / "atoms.xyz").write_text("2\n\nH 0 0 0\nH 0 0 0.74\n")
    (tmp_path / "empty.json").write_text(session.model_copy(update={"runs": ()}).model_dump_json())
    status, out, err = thalweg("solve", "H2", "--basis", "6-31g", *words, "--quiet")
    assert (status, out) == (2, "")
    assert sentence in err.splitlines()[-1]


def test_the_end_of_a_grown_run_and_the_line_between_two_of_them_can_be_looked_at(thalweg, tmp_path):
    for most in ("1", "3"):
        words = ["--ansatz", "adaptive", "--ansatz-set", f"max_operators={most}", "--ansatz-set", "at_target=no"]
        assert thalweg("solve", "H2", "--basis", "6-31g", *words, "--save", "g.json", "--quiet")[0] == 0
    short, full = (run.result for run in load_session(tmp_path / "g.json").runs)
    look = ["diagnose", "g.json", "--run", "2", "--json", "-", "--quiet"]
    _, out, _ = thalweg(*look, "--what", "landscape", "--along", "run:1", "--points", "5")
    line = LandscapeResult.model_validate(json.loads(out))
    assert line.energies[1][0] == pytest.approx(full.energy, abs=1e-9)
    assert line.energies[3][0] == pytest.approx(short.energy, abs=1e-9)
    _, out, _ = thalweg(*look, "--what", "curvature")
    assert len(Curvature.model_validate(json.loads(out)).eigenvalues) == full.parameters
    status, _, err = thalweg("diagnose", "g.json", "--run", "1", "--what", "landscape", "--along", "run:2", "--quiet")
    assert (status, "lacks" in err) == (2, True)


def test_the_curvature_of_a_run_without_parameters_is_told_without_empty_figures(thalweg):
    words = ["H2", "--ansatz", "adaptive", "--reference", "20,02"]
    status, out, _ = thalweg("diagnose", *words, "--what", "curvature", "--quiet")
    assert status == 0
    assert "No parameters, no curvature." in out
    assert "Lowest curvatures" not in out
