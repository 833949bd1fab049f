"""Small combinations as a person types them."""

from __future__ import annotations

import numpy as np
import pytest

from thalweg.errors import StudyError
from thalweg.systems.combination import combination_text, read_combination


def word(text):
    signs = text.strip()
    if not signs.isalnum():
        raise StudyError("No state", f"'{signs}'", "Write one", "reference")
    return signs


@pytest.mark.parametrize(
    ("text", "states", "amplitudes"),
    [
        ("2200", ("2200",), (1.0,)),
        ("0.6*2200 - 0.8*2020", ("2200", "2020"), (0.6, -0.8)),
        ("3*2200+4*2020", ("2200", "2020"), (0.6, 0.8)),
        ("-3*2200 + 4 * 2020", ("2200", "2020"), (-0.6, 0.8)),
        ("2ab0 - 2ba0", ("2ab0", "2ba0"), (0.5**0.5, -(0.5**0.5))),
        ("6e-1*2200 - 8E-1*2020", ("2200", "2020"), (0.6, -0.8)),
        (".6·2200 - .8×2020", ("2200", "2020"), (0.6, -0.8)),
        ("3e200*2200 + 4e200*2020", ("2200", "2020"), (0.6, 0.8)),
        ("3e-200*2200 + 4e-200*2020", ("2200", "2020"), (0.6, 0.8)),
        ("2200, 2020,", ("2200", "2020"), ()),
    ],
)
def test_sums_are_normalised_and_lists_have_no_amplitudes(text, states, amplitudes):
    found = read_combination(text, word)
    assert found.states == states
    assert found.amplitudes == pytest.approx(amplitudes)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("2200 + 2200", "stands twice"),
        ("2200, 2200", "stands twice"),
        ("0*2200 + 2020", "amplitude of the reference is zero"),
        ("1e-300*2200 + 2020", "amplitude of the reference is zero"),
        ("1e999*2200 + 2020", "too large"),
        ("0.5*2200*2 + 2020", "not an amplitude times a state"),
        ("1.2.3*2200 + 2020", "is no number"),
        ("0.9*2200 -", "No state"),
        ("+", "No state"),
        (",", "names no state"),
        (" + ".join(f"1*{i:05b}" for i in range(17)), "too long"),
    ],
)
def test_what_is_no_combination_is_refused_with_the_reason(text, words):
    with pytest.raises(StudyError, match=words) as error:
        read_combination(text, word)
    assert error.value.field == "reference"


def test_a_list_takes_the_lowest_state_of_the_matrix_with_its_largest_amplitude_positive():
    amplitudes = read_combination("a, b, c", word).amplitudes_in(np.array([[0.0, 1.0, 0.0], [1.0, -1.5, 0.0], [0.0, 0.0, 9.0]]))
    assert amplitudes == pytest.approx([-(0.2**0.5), 0.8**0.5, 0.0])


def test_a_list_without_one_lowest_state_is_refused():
    with pytest.raises(StudyError, match="no one lowest state"):
        read_combination("a, b", word).amplitudes_in(np.eye(2))


def test_the_text_is_read_back():
    text = combination_text([(0.6, "2200"), (-0.8, "2020")])
    assert text == "0.6*2200 - 0.8*2020"
    assert read_combination(text, word).amplitudes == pytest.approx((0.6, -0.8))


def test_a_long_combination_names_its_largest_terms():
    assert combination_text([(0.1, "a"), (0.5, "b"), (-0.6, "c"), (0.3, "d"), (0.2, "e")]) == "0.5*b - 0.6*c + 0.3*d + 0.2*e and 1 more"
