import pytest
import studies

from thalweg.systems import LatticeModel
from thalweg_app.presenters.history import History
from thalweg_app.presenters.ledger import COLUMNS, Ledger


@pytest.fixture
def history():
    return History()


@pytest.fixture
def ledger(history):
    made = Ledger(history)
    for error in (3e-3, 1e-5, 2e-4):
        made.add(studies.result(error))
    return made


def column(name):
    return next(i for i, c in enumerate(COLUMNS) if c.name == name)


def test_runs_are_numbered_in_order_and_the_latest_is_selected(ledger):
    assert [r.number for r in ledger.runs] == [1, 2, 3]
    assert ledger.selected.number == 3


def test_a_number_is_never_given_twice(ledger):
    ledger.delete(3)
    assert ledger.add(studies.result()).number == 4


def test_rows_sort_by_value_in_both_directions(ledger):
    ledger.sort(column("Error"), False)
    assert [r.number for r in ledger.rows] == [2, 3, 1]
    ledger.sort(column("Error"), True)
    assert [r.number for r in ledger.rows] == [1, 3, 2]


@pytest.mark.parametrize("descending", [True, False])
def test_runs_without_the_figure_come_last(ledger, descending):
    ledger.add(studies.result(error=1e-5).model_copy(update={"error": None, "exact_energy": None}))
    ledger.sort(column("Error"), descending)
    assert ledger.rows[-1].number == 4


def test_every_column_sorts_and_has_a_help_text(ledger):
    for i, c in enumerate(COLUMNS):
        ledger.sort(i, False)
        assert len(ledger.rows) == 3
        assert c.help


def test_deleting_selects_a_neighbour_and_undo_brings_the_run_back(ledger, history):
    ledger.select(2)
    ledger.delete(2)
    assert [r.number for r in ledger.runs] == [1, 3]
    assert ledger.selected.number == 3
    history.undo()
    assert [r.number for r in ledger.runs] == [1, 2, 3]
    assert ledger.selected.number == 2
    history.redo()
    assert [r.number for r in ledger.runs] == [1, 3]


def test_undo_of_a_deletion_leaves_runs_that_came_later(ledger, history):
    ledger.delete(1)
    ledger.add(studies.result())
    history.undo()
    assert [r.number for r in ledger.runs] == [1, 2, 3, 4]


def test_notes_are_edited_with_undo(ledger, history):
    ledger.annotate(1, "baseline")
    assert ledger.run(1).note == "baseline"
    history.undo()
    assert ledger.run(1).note == ""
    assert history.redo_text == "note on run 1"


def test_ticks_choose_what_is_laid_over(ledger):
    ledger.tick(1, True)
    ledger.tick(3, True)
    ledger.tick(1, False)
    assert [r.number for r in ledger.ticked] == [3]


def test_deleting_the_last_run_leaves_no_selection(ledger):
    for number in (1, 2, 3):
        ledger.delete(number)
    assert ledger.selected is None


def test_headings_carry_units_and_rows_of_mixed_units_their_own(ledger):
    assert "Energy / Eh" in ledger.header
    assert "Error / mEh" in ledger.header
    ledger.add(studies.result().model_copy(update={"energy_unit": "J"}))
    assert "Energy" in ledger.header
    assert ledger.cell(ledger.run(4), column("Energy")).endswith(" J")
    assert ledger.cell(ledger.run(1), column("Error")) == "3 mEh"


def test_loading_takes_runs_over_and_goes_on_numbering(ledger, history):
    other = Ledger(history)
    other.load(ledger.runs[1:])
    assert other.selected.number == 3
    assert other.add(studies.result()).number == 4


def test_listeners_hear_of_rows_and_of_selection(ledger):
    rows, selections = [], []
    ledger.changed.connect(lambda: rows.append(1))
    ledger.selection_changed.connect(lambda: selections.append(1))
    ledger.select(1)
    assert (len(rows), len(selections)) == (0, 1)
    ledger.delete(1)
    assert (len(rows), len(selections)) == (1, 2)


def test_a_run_of_spins_shows_no_encoding(ledger):
    ledger.add(studies.result(spec=studies.study(system=LatticeModel())))
    column = next(i for i, c in enumerate(COLUMNS) if c.name == "Encoding")
    assert ledger.cell(ledger.rows[-1], column) == "–"


def test_the_heading_has_the_unit_until_a_run_with_another_comes_and_again_when_it_goes(ledger):
    assert "Energy / Eh" in ledger.header
    other = ledger.add(studies.result(energy_unit="1"))
    assert "Energy" in ledger.header
    ledger.delete(other.number)
    assert "Energy / Eh" in ledger.header


def test_cells_do_not_look_through_all_runs(ledger):
    class Counted(tuple):
        looks = 0

        def __iter__(self):
            Counted.looks += 1
            return super().__iter__()

    ledger._runs = Counted(ledger.runs)
    for run in ledger.rows:
        for column in range(len(COLUMNS)):
            ledger.cell(run, column)
    assert Counted.looks < 5
