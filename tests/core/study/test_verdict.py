"""The verdict says yes only when everything is in order, and says no in words."""

from dataclasses import replace

import pytest

from thalweg.study.verdict import Evidence, amount, judge
from thalweg.units import CHEMICAL_ACCURACY

GOOD = Evidence(
    unit="hartree",
    error=1.1e-5,
    target=CHEMICAL_ACCURACY,
    reference_error=0.02,
    stop_reason="gradient",
    gradient_norm=1e-7,
    start_gradient_norm=0.1,
    lowered=0.02,
    parameters=44,
    two_qubit_gates=1216,
    n_electrons=4.0,
    expected_electrons=4,
    s_z=0.0,
    expected_s_z=0,
    s_squared=1e-9,
    exact_s_squared=0.0,
)


def test_a_good_run_reaches_the_target_and_states_its_cost():
    verdict = judge(GOOD)
    assert verdict.reached
    assert verdict.sentence == "Reaches chemical accuracy: 0.011 mEh above exact with 44 parameters; 1,216 two-qubit gates"


@pytest.mark.parametrize(
    ("change", "kind", "words"),
    [
        ({"error": None}, "no-exact", "No exact energy"),
        ({"n_electrons": 3.2}, "wrong-symmetry", "particle number 3.200 instead of 4"),
        ({"s_z": 0.4}, "wrong-symmetry", "S_z 0.400 instead of 0"),
        ({"s_squared": 2.0}, "wrong-symmetry", "S^2 2.000 instead of 0.000"),
        ({"error": -0.01}, "wrong-symmetry", "Below the exact energy"),
        ({"error": 0.02, "lowered": 0.0, "start_gradient_norm": 0.0}, "stationary", "Stationary start"),
        ({"error": 0.02, "stop_reason": "evaluations"}, "not-converged", "Not converged: 20 mEh above exact"),
        ({"error": 0.02}, "outside", "Outside chemical accuracy: 20 mEh above exact"),
    ],
)
def test_anything_amiss_is_a_no(change, kind, words):
    verdict = judge(replace(GOOD, **change))
    assert not verdict.reached
    assert verdict.kind == kind
    assert words in verdict.sentence


@pytest.mark.parametrize(
    ("change", "is_told"),
    [
        ({"exact_s_squared": 2.0, "error": 0.08}, True),  # a singlet was asked for and found; the lowest state is a triplet
        ({"s_squared": 2.0}, False),
        ({"exact_s_squared": 2.0, "s_squared": 1.0}, False),
        ({"exact_s_squared": 2.0, "n_electrons": 3.0}, False),
    ],
)
def test_a_state_of_the_spin_asked_for_is_told_how_to_be_compared(change, is_told):
    verdict = judge(replace(GOOD, **change))
    assert verdict.kind == "wrong-symmetry"
    assert ("`fixed`" in verdict.sentence) == is_told


def test_wrong_symmetry_outranks_a_small_error():
    assert judge(replace(GOOD, error=0.0, s_squared=2.0)).kind == "wrong-symmetry"


def test_an_interrupted_search_inside_the_target_says_so():
    verdict = judge(replace(GOOD, stop_reason="stopped-by-person"))
    assert verdict.reached
    assert "not converged" in verdict.sentence


def test_another_target_and_unit_are_named():
    assert "the target of 0.01 J" in judge(replace(GOOD, unit="J", target=0.01, error=0.002)).sentence


SAMPLED = {"standard_error": 2e-4, "measured_error": 1.5e-4}


def test_a_measured_energy_is_stated_with_its_error_bar():
    verdict = judge(replace(GOOD, **SAMPLED))
    assert verdict.reached
    assert verdict.sentence.endswith("; measured 0.15 mEh above exact, with an error bar of 0.4 mEh (two standard errors)")
    below = judge(replace(GOOD, standard_error=2e-4, measured_error=-3e-4))
    assert below.reached
    assert "measured 0.3 mEh below exact" in below.sentence


def test_an_error_bar_wider_than_the_target_shows_nothing():
    verdict = judge(replace(GOOD, standard_error=CHEMICAL_ACCURACY / 1.9, measured_error=0.0))
    assert (verdict.kind, verdict.reached) == ("uncertain", False)
    assert "the error bar of 1.68 mEh (two standard errors) is wider than chemical accuracy" in verdict.sentence
    assert judge(replace(GOOD, standard_error=CHEMICAL_ACCURACY / 2.1, measured_error=0.0)).reached


def test_a_state_outside_the_target_is_outside_however_wide_the_error_bar():
    verdict = judge(replace(GOOD, error=0.02, standard_error=0.1, measured_error=-0.01))
    assert verdict.kind == "outside"
    assert "error bar of 200 mEh" in verdict.sentence


def test_the_error_that_shots_would_have_counts_like_a_measured_one():
    verdict = judge(replace(GOOD, standard_error=1e-4))
    assert verdict.reached
    assert verdict.sentence.endswith("; shots would have an error bar of 0.2 mEh (two standard errors)")
    assert judge(replace(GOOD, standard_error=0.01)).kind == "uncertain"


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (1.0514e-5, "hartree", "0.0105 mEh"),
        (-2.2e-16, "hartree", "0 mEh"),
        (3.2e-14, "J", "0 J"),
        (-2e-12, "hartree", "-2e-09 mEh"),
        (0.25, "t", "0.25 t"),
    ],
)
def test_differences_are_told_in_words_and_rounding_as_nothing(value, unit, text):
    assert amount(value, unit) == text
