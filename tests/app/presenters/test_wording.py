import pytest

from thalweg_app.presenters import wording


@pytest.mark.parametrize(
    ("value", "text"), [(1.05e-5, "0.0105"), (1.6e-3, "1.6"), (2e-7, "2.00e−4"), (0.0, "0"), (-3.4e-3, "−3.4"), (0.123456, "123")]
)
def test_hartree_differences_are_shown_in_millihartree_with_three_digits(value, text):
    assert wording.difference(value) == text


def test_differences_of_other_units_are_left_in_their_unit():
    assert wording.difference(0.25, "J", "kcal/mol") == "0.25"
    assert wording.difference_factor("J", "kcal/mol") == (1.0, "J")


def test_differences_follow_the_unit_chosen():
    # 1 hartree = 627.5094740631 kcal/mol (CODATA 2022)
    assert wording.difference(1e-3, "hartree", "kcal/mol") == "0.628"


def test_a_missing_figure_is_a_dash():
    assert wording.energy(None) == wording.difference(None) == wording.count(None) == wording.MISSING


@pytest.mark.parametrize(("value", "text"), [(1, "1 parameter"), (0, "0 parameters"), (1216, "1,216 parameters")])
def test_counted_nouns_agree(value, text):
    assert wording.counted(value, "parameter") == text


@pytest.mark.parametrize(("value", "text"), [(10, "10 bytes"), (30825, "30.1 KiB"), (5 * 2**20, "5 MiB"), (3 * 2**30, "3 GiB")])
def test_memory_has_a_fitting_unit(value, text):
    assert wording.bytes_text(value) == text


@pytest.mark.parametrize(
    ("seconds", "text"), [(0.2, "about 1 s left"), (42, "about 42 s left"), (300, "about 5 min left"), (9000, "about 2.5 h left")]
)
def test_time_left_is_rounded_like_a_guess(seconds, text):
    assert wording.time_left(seconds) == text


@pytest.mark.parametrize(
    ("plain", "printed"),
    [
        ("variance 0.0123 +- 0.001 Eh^2, 4 parameters", "variance 0.0123 ± 0.001 Eh², 4 parameters"),
        ("-1.5 Eh at -0.25", "−1.5 Eh at −0.25"),
        ("one-qubit gates, 1e-05", "one-qubit gates, 1e−05"),
    ],
)
def test_plain_letters_become_the_signs_of_print(plain, printed):
    assert wording.typeset(plain) == printed
