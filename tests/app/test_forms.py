import pytest
import studies
from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QCheckBox, QComboBox, QLineEdit

from thalweg.errors import StudyError
from thalweg.study.spec import SECTIONS, StudySpec
from thalweg_app.forms import OptionsForm, TextEntry
from thalweg_app.presenters.history import History
from thalweg_app.presenters.setup import SetupEditing


@pytest.fixture
def setup():
    return SetupEditing(History(), studies.study())


def form_of(qtbot, setup, options, prefix=""):
    form = OptionsForm(options, prefix)
    qtbot.addWidget(form)
    form.edited.connect(setup.edit)
    setup.changed.connect(lambda: form.show_values(setup.shown, setup.errors))
    form.show_values(setup.shown, setup.errors)
    form.show()
    return form


@pytest.mark.parametrize("options", [cls for section in SECTIONS.values() for cls in section])
def test_every_alternative_has_a_form_whose_editors_are_named_and_explained(qtbot, options):
    form = OptionsForm(options, "x")
    qtbot.addWidget(form)
    for row in form.rows:
        assert row.editor.accessibleName()
        assert row.editor.toolTip()
        assert row.editor.property("help")


def test_widgets_follow_from_the_kind_of_field(qtbot, setup):
    form = form_of(qtbot, setup, type(setup.spec.ansatz), "ansatz")
    assert isinstance(form.editor("ansatz.order"), QComboBox)
    assert isinstance(form.editor("ansatz.spin_tied"), QCheckBox)
    assert isinstance(form_of(qtbot, setup, StudySpec).editor("seed"), QLineEdit)


def test_typing_a_number_with_a_comma_and_return_commits_it(qtbot, setup):
    form = form_of(qtbot, setup, type(setup.spec.stop), "stop")
    entry = form.editor("stop.gradient")
    entry.setFocus()
    entry.selectAll()
    QTest.keyClicks(entry, "2,5e-7")
    assert setup.spec.stop.gradient == 1e-6  # not before it is committed
    QTest.keyClick(entry, Qt.Key.Key_Return)
    assert setup.spec.stop.gradient == 2.5e-7


def test_bad_input_is_marked_with_a_sentence_and_stays(qtbot, setup):
    form = form_of(qtbot, setup, StudySpec)
    entry = form.editor("starts")
    entry.setFocus()
    entry.selectAll()
    QTest.keyClicks(entry, "many")
    QTest.keyClick(entry, Qt.Key.Key_Return)
    row = next(r for r in form.rows if r.path == "starts")
    assert entry.text() == "many"
    assert row.error.isVisible()
    assert "many" in row.error.text()
    assert entry.property("bad")
    entry.selectAll()
    QTest.keyClicks(entry, "3")
    QTest.keyClick(entry, Qt.Key.Key_Return)
    assert not row.error.isVisible()
    assert not entry.property("bad")


def test_escape_brings_the_committed_text_back(qtbot, setup):
    entry = form_of(qtbot, setup, StudySpec).editor("seed")
    entry.setFocus()
    QTest.keyClicks(entry, "99")
    QTest.keyClick(entry, Qt.Key.Key_Escape)
    assert entry.text() == "1"


def test_a_menu_and_a_switch_hand_over_their_choice(qtbot, setup):
    form = form_of(qtbot, setup, type(setup.spec.ansatz), "ansatz")
    combo = form.editor("ansatz.order")
    combo.setFocus()
    QTest.keyClick(combo, Qt.Key.Key_Down)
    assert setup.spec.ansatz.order == "singles-first"
    form.editor("ansatz.spin_tied").click()
    assert setup.spec.ansatz.spin_tied


def test_several_choices_are_handed_over_in_their_order(qtbot, setup):
    form = form_of(qtbot, setup, StudySpec)
    boxes = form.editor("classical").findChildren(QCheckBox)
    boxes[1].click()
    boxes[0].click()
    assert setup.spec.classical == ("mp2", "ccsd")


def test_an_error_in_an_advanced_field_opens_the_fold(qtbot, setup):
    form = form_of(qtbot, setup, StudySpec)
    assert not form.fold.is_open
    setup.refuse(setup.spec, StudyError("Too large", "the budget is small", "Raise it", "memory_gib"))
    assert form.fold.is_open


def test_undo_of_the_window_passes_a_field_that_holds_nothing_uncommitted(qtbot):
    from PySide6.QtCore import QEvent
    from PySide6.QtGui import QKeyEvent

    entry = TextEntry(True)
    qtbot.addWidget(entry)
    entry.show_value("1")
    undo = QKeyEvent(QEvent.Type.ShortcutOverride, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    entry.event(undo)
    assert not undo.isAccepted()
    entry.setText("12")
    undo = QKeyEvent(QEvent.Type.ShortcutOverride, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    entry.event(undo)
    assert undo.isAccepted()
