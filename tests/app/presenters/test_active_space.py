import pytest
import studies

from thalweg_app.presenters.active_space import listing, toggled


@pytest.mark.parametrize(("numbers", "text"), [([2, 3, 5, 6, 7, 8], "2,3,5-8"), ([1], "1"), ([1, 2, 3], "1-3"), ([4, 2], "2,4"), ([1, 2], "1,2")])
def test_orbital_lists_are_written_short(numbers, text):
    assert listing(numbers) == text


def test_a_click_leaves_an_orbital_out_and_another_takes_it_back():
    ladder = studies.figures().ladder
    assert toggled(ladder, 1) == "2-6"
    without = [rung.model_copy(update={"active": rung.number != 1}) for rung in ladder]
    assert toggled(without, 1) == "all"


def test_the_last_orbital_cannot_be_left_out():
    ladder = [r.model_copy(update={"active": r.number == 2}) for r in studies.figures().ladder]
    assert toggled(ladder, 2) == "2"
