"""Widgets that are built late stand where the Tab key expects them."""

import pytest

from thalweg_app.plots.picture import Picture
from thalweg_app.widgets.tab_order import visited


def test_pictures_are_built_when_they_are_shown_first(window):
    assert len(window.pictures.findChildren(Picture)) == 1
    window.show_picture(3)
    assert {type(p).title for p in window.pictures.findChildren(Picture)} == {"Convergence", "State"}
    assert window.pictures.findChildren(Picture)[-1].palette_now == window.theme.palette


def test_all_pictures_are_built_ahead_one_after_the_other(window):
    counts = [len(window.pictures.findChildren(Picture)) for _ in window.pictures.prepare()]
    assert counts[-4:] == [2, 3, 4, 5]
    assert [type(p).title for p in window.pictures] == ["Convergence", "Curve", "Hamiltonian", "State", "Diagnosis"]
    assert len(window.pictures.findChildren(Picture)) == 5


@pytest.mark.parametrize("place", range(5))
def test_the_tab_key_leads_from_the_tabs_into_the_picture_and_then_to_the_ledger(window, place):
    window.show_picture(place)
    order = [w for w in visited(window) if w.isVisible()]
    inside = [i for i, w in enumerate(order) if window.picture.isAncestorOf(w)]
    assert inside == list(range(inside[0], inside[-1] + 1))
    assert order.index(window.pictures.tabBar()) == inside[0] - 1
    assert window.ledger_view.isAncestorOf(order[inside[-1] + 1])


@pytest.mark.parametrize("place", range(5))
def test_the_tab_key_visits_a_pictures_own_controls_before_its_tools(window, place):
    window.show_picture(place)
    picture = window.picture
    order = visited(window)
    own = [picture.controls.itemAt(i).widget() for i in range(picture.controls.count())]
    own = [order.index(w) for w in own if w is not None and w in order]
    tools = [order.index(button) for button, _ in picture._tools]
    assert [*own, *tools] == sorted([*own, *tools])
    assert tools == list(range(tools[0], tools[-1] + 1))


def test_the_tab_key_visits_a_form_after_the_menu_that_chose_it(window):
    window.column.sections["optimizer"].set_open(True)
    choice = window.column.search.choice
    choice.menu.setCurrentIndex(choice.menu.findData("adam"))
    choice.menu.activated.emit(choice.menu.currentIndex())
    order = [w for w in visited(window) if w.isVisible()]
    assert order[order.index(choice.menu) + 1] is choice._forms["adam"].rows[0].editor
