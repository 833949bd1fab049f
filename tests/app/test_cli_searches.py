"""Trial states, searches, evaluations and diagnoses from the command line."""

from __future__ import annotations

import json

import pytest

from thalweg.registry import key_of
from thalweg.study.diagnosis_result import Curvature, LandscapeResult, StartSpread, TrainabilityResult
from thalweg.study.result import StudyResult
from thalweg_app.presenters.numbers import parse_wholes
from thalweg_app.terminal.methods import HEADINGS, registries


def found(thalweg, record, *words: str):
    status, out, err = thalweg(*words, "--json", "-", "--quiet")
    assert status == 0, err
    return record.model_validate(json.loads(out))


def test_settings_of_trial_state_search_and_evaluation_have_options_of_their_own(thalweg):
    words = "solve H2 --ansatz k-upccgsd --ansatz-set k=1 --start small-random --optimizer spsa --optimizer-set max_iterations=5"
    result = found(thalweg, StudyResult, *words.split(), "--evaluation", "shots", "--shots", "500", "--evaluation-set", "allocation=uniform")
    spec = result.spec
    assert (spec.ansatz.k, spec.ansatz.start, spec.optimizer.max_iterations) == (1, "small-random", 5)
    assert (spec.evaluation.key, spec.evaluation.shots, spec.evaluation.allocation) == ("shots", 500, "uniform")
    assert result.measured_energy is not None
    assert result.shots == 500 * (2 * 25 + 2 * 5 + 1)  # calibration, steps, the found point once more


def test_the_answer_states_the_measured_energy_beside_that_without_noise(thalweg):
    status, out, _ = thalweg(
        "solve", "H2", "--evaluation", "shots", "--optimizer", "sequential-minimal", "--optimizer-set", "max_iterations=2", "--quiet"
    )
    assert status == 0
    assert out.startswith("Not shown by the shots")
    assert "Measured" in out
    assert "two standard errors" in out
    assert "shots" in next(line for line in out.splitlines() if line.startswith("Circuits run"))


@pytest.mark.parametrize("axis", ["iteration", "evaluations", "circuits", "shots", "seconds"])
def test_the_figure_is_drawn_against_any_count(thalweg, tmp_path, axis):
    words = ["--evaluation", "shots", "--optimizer", "adam", "--optimizer-set", "max_iterations=3", "--figure", "f.svg", "--x-axis", axis, "--quiet"]
    assert thalweg("solve", "H2", *words)[0] == 0
    titles = {"iteration": "Iteration", "evaluations": "Energy evaluations", "circuits": "Circuits run", "shots": "Shots", "seconds": "Seconds"}
    assert titles[axis] in (tmp_path / "f.svg").read_text()


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["--shots", "100"], "Exact has no setting 'shots'"),
        (["--optimizer-set", "foo=1"], "L-BFGS-B has no setting 'foo'"),
        (["--optimizer-set", "history"], "--optimizer-set history has no value"),
        (["--optimizer", "icans"], "iCANS cannot search here"),
        (["--evaluation", "shots", "--shots", "1"], "too few"),
        (["--start", "somewhere"], "ansatz.start"),
    ],
)
def test_what_does_not_fit_is_one_sentence_and_status_two(thalweg, words, sentence):
    status, out, err = thalweg("solve", "H2", *words, "--quiet")
    assert (status, out) == (2, "")
    assert sentence in err.splitlines()[-1]


def test_methods_lists_every_key_of_every_registry_on_one_line_each(thalweg):
    status, out, _ = thalweg("methods")
    assert status == 0
    assert set(HEADINGS) == set(registries())
    keys = [line.split()[0] for line in out.splitlines() if line.startswith("  ")]
    assert keys == [key for kind in HEADINGS for key in map(key_of, registries()[kind])]
    assert all(line.rstrip().endswith(".") for line in out.splitlines() if line.startswith("  "))


def test_methods_can_list_one_kind_with_its_settings(thalweg):
    _, out, _ = thalweg("methods", "optimizer", "--settings")
    assert "spsa" in out
    assert "uccsd" not in out
    assert "step_exponent=0.602" in out


def test_trainability_is_told_in_a_sentence_a_table_a_picture_and_json(thalweg, tmp_path):
    sizes = ["--cost", "global", "--qubits", "2-5", "--samples", "60"]
    words = ["diagnose", "ring_8_heisenberg", "--what", "trainability", "--ansatz", "hardware-efficient", "--depth", "1", *sizes]
    status, out, _ = thalweg(*words, "--quiet", "--figure", "t.svg")
    assert status == 0
    assert "ecays" in out.splitlines()[0]
    assert "5 qubits, 1 layer" in out
    assert "Variance of the gradient" in (tmp_path / "t.svg").read_text()
    record = found(thalweg, TrainabilityResult, *words)
    assert [p.qubits for p in record.points] == [2, 3, 4, 5]
    assert record.decays[0].factor < 0.6


def test_processes_give_the_same_numbers(thalweg):
    words = ["diagnose", "H2", "--what", "trainability", "--ansatz", "hardware-efficient", "--layers", "1,2", "--samples", "10"]
    assert found(thalweg, TrainabilityResult, *words) == found(thalweg, TrainabilityResult, *words, "--workers", "2")


def test_the_line_between_two_runs_of_a_session_and_the_end_of_one(thalweg, tmp_path):
    run = ["solve", "H2", "--ansatz", "k-upccgsd", "--ansatz-set", "k=1", "--start", "small-random", "--save", "s.json", "--quiet"]
    for seed in ("1", "2"):
        assert thalweg(*run, "--seed", seed)[0] == 0
    line = found(thalweg, LandscapeResult, "diagnose", "s.json", "--run", "1", "--what", "landscape", "--along", "run:2", "--points", "5")
    assert line.energies[1][0] == pytest.approx(line.centre_energy)
    assert line.labels == ("towards the other point",)
    assert thalweg("diagnose", "s.json", "--run", "1", "--what", "landscape", "--along", "run:2", "--quiet", "--figure", "l.svg")[0] == 0
    assert "part of the way" in (tmp_path / "l.svg").read_text()
    bottom = found(thalweg, Curvature, "diagnose", "s.json", "--run", "2", "--what", "curvature")
    assert bottom.kind in ("minimum", "flat")
    status, _, err = thalweg("diagnose", "s.json", "--run", "7", "--what", "curvature", "--quiet")
    assert (status, "no run 7" in err) == (2, True)


def test_curvature_and_starts_run_the_study_where_no_run_is_named(thalweg):
    assert found(thalweg, Curvature, "diagnose", "H2", "--what", "curvature").kind == "minimum"
    assert found(thalweg, StartSpread, "diagnose", "H2", "--what", "starts", "--starts", "3").starts == 3


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        (["--what", "landscape", "--along", "uphill"], "is no direction"),
        (["--what", "landscape", "--along", "run:1"], "holds no runs"),
        (["--what", "landscape", "--run", "1"], "holds no runs"),
        (["--what", "trainability", "--layers", "1,x"], "no list of numbers"),
        (["--what", "trainability", "--layers", "2"], "has no layers"),
        (["--what", "trainability", "--samples", "2"], "samples"),
        (["--what", "landscape", "--along", "random", "--along", "random", "--along", "random"], "directions"),
    ],
)
def test_a_diagnosis_that_cannot_be_is_refused_in_a_sentence(thalweg, words, sentence):
    status, out, err = thalweg("diagnose", "H2", *words, "--quiet")
    assert (status, out) == (2, "")
    assert sentence in err.splitlines()[-1]


def test_lists_of_numbers_hold_ranges():
    assert parse_wholes("2,4,6-8") == (2, 4, 6, 7, 8)
    assert parse_wholes("") == ()
