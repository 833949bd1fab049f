import contextlib
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from thalweg.errors import StudyError
from thalweg_app.presenters.numbers import number_text, parse_number, parse_whole


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("0.735", 0.735),
        ("0,735", 0.735),
        ("1e-6", 1e-6),
        ("1E-6", 1e-6),
        ("1D-6", 1e-6),
        (".5", 0.5),
        (",5", 0.5),
        ("-2", -2.0),
        ("\u22121.5", -1.5),
        (" 7 ", 7.0),
        ("5.", 5.0),
    ],
)
def test_numbers_are_read_as_people_type_them(text, value):
    assert parse_number(text) == value


@pytest.mark.parametrize("text", ["", "abc", "1.2.3", "1,2,3", "nan", "inf", "1e999", "0x10", "1 2", "--1", "1e"])
def test_what_is_no_number_is_said_in_a_sentence_with_its_field(text):
    with pytest.raises(StudyError) as caught:
        parse_number(text, "stop.gradient")
    assert caught.value.field == "stop.gradient"
    assert caught.value.fix


@pytest.mark.parametrize(("text", "value"), [("20000", 20000), ("20,000", 20000), ("2e4", 20000), ("1 000", 1000), ("-3", -3), ("7.0", 7)])
def test_whole_numbers_take_thousands_and_exponents(text, value):
    assert parse_whole(text) == value


@pytest.mark.parametrize("text", ["2.5", "1,5", "", "two"])
def test_a_broken_whole_number_is_refused(text):
    with pytest.raises(StudyError):
        parse_whole(text)


@given(st.floats(allow_nan=False, allow_infinity=False, min_value=-1e200, max_value=1e200))
def test_shown_numbers_read_back_to_eight_digits(value):
    assert parse_number(number_text(value)) == pytest.approx(value, rel=1e-7, abs=0.0)


@given(st.text())
def test_any_text_gives_a_number_or_a_sentence(text):
    for parse in (parse_number, parse_whole):
        with contextlib.suppress(StudyError):
            assert math.isfinite(parse(text))


@pytest.mark.parametrize(("value", "text"), [(1e-6, "1e-6"), (0.0, "0"), (0.0015936014376410235, "0.0015936014"), (0.3, "0.3"), (20000, "20000")])
def test_shown_numbers_are_short(value, text):
    assert number_text(value) == text
