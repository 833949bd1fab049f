import pytest
import studies

from thalweg.ansatz import UCCSD, HardwareEfficient
from thalweg.errors import StudyError
from thalweg.systems import Integrals, Molecule
from thalweg_app.presenters.history import History
from thalweg_app.presenters.setup import SetupEditing


@pytest.fixture
def setup():
    return SetupEditing(History(), studies.study())


def test_text_is_read_as_the_kind_of_its_field(setup):
    setup.edit("system.charge", "1")
    setup.edit("stop.gradient", "1,5e-7")
    setup.edit("system.name", " 123 ")
    assert (setup.spec.system.charge, setup.spec.stop.gradient, setup.spec.system.name) == (1, 1.5e-7, "123")


def test_bad_input_stays_in_its_field_with_a_sentence_and_blocks_running(setup):
    setup.edit("system.multiplicity", "three")
    assert setup.shown("system.multiplicity") == "three"
    assert setup.spec.system.multiplicity == 1
    assert setup.errors["system.multiplicity"].field == "system.multiplicity"
    assert "three" in setup.obstacle


def test_a_value_out_of_bounds_is_an_error_of_its_field(setup):
    setup.edit("starts", "0")
    assert set(setup.errors) == {"starts"}
    setup.edit("starts", "2")
    assert setup.spec.starts == 2
    assert not setup.errors
    assert not setup.obstacle


def test_putting_the_old_value_back_clears_the_error(setup):
    setup.edit("starts", "x")
    setup.edit("starts", "1")
    assert not setup.errors


def test_several_bad_fields_are_kept_at_once(setup):
    setup.edit("starts", "x")
    setup.edit("seed", "y")
    setup.edit("system.charge", "1")
    assert set(setup.errors) == {"starts", "seed"}
    assert setup.spec.system.charge == 1


def test_every_edit_can_be_undone_and_redone():
    history = History()
    setup = SetupEditing(history, studies.study())
    before = setup.spec
    setup.edit("system.charge", "1")
    setup.edit("starts", "many")
    setup.choose("ansatz", "hardware-efficient")
    after = setup.draft
    for _ in range(3):
        history.undo()
    assert setup.spec == before
    assert not setup.errors
    for _ in range(3):
        history.redo()
    assert setup.draft == after


def test_an_edit_without_change_is_not_an_edit():
    history = History()
    setup = SetupEditing(history, studies.study())
    setup.edit("system.basis", "sto-3g")
    setup.choose("ansatz", "uccsd")
    assert history.undo_text == ""


def test_undo_names_what_it_takes_back(setup):
    history = History()
    setup = SetupEditing(history, studies.study())
    setup.edit("system.basis", "6-31g")
    assert history.undo_text == "change of basis set"


def test_an_alternative_comes_back_as_it_was_left(setup):
    setup.edit("ansatz.spin_tied", True)
    setup.choose("ansatz", "hardware-efficient")
    assert isinstance(setup.spec.ansatz, HardwareEfficient)
    setup.choose("ansatz", "uccsd")
    assert setup.spec.ansatz == UCCSD(spin_tied=True)


def test_shared_settings_are_carried_to_another_alternative(setup):
    setup.edit("encoding.taper", False)
    setup.choose("encoding", "parity")
    assert setup.spec.encoding.taper is False


def test_switching_drops_errors_of_the_fields_that_go(setup):
    setup.edit("optimizer.max_iterations", "x")
    setup.choose("optimizer", "adam")
    assert not setup.errors


def test_cells_of_the_atom_table_are_edited_one_by_one(setup):
    setup.edit_atom(1, 3, "1,7")
    setup.edit_atom(0, 0, "na")
    assert setup.spec.system.atoms == (("Na", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 1.7))


def test_a_bad_cell_keeps_its_text_until_it_is_mended(setup):
    setup.edit_atom(0, 0, "Xx")
    assert setup.draft.typed == {"system.atoms.0.0": "Xx"}
    assert "no element" in setup.obstacle
    setup.edit_atom(0, 0, "Li")
    assert not setup.errors


def test_atoms_are_added_and_removed_with_undo():
    history = History()
    setup = SetupEditing(history, studies.study())
    setup.add_atom()
    assert [a[0] for a in setup.spec.system.atoms] == ["Li", "H", "H"]
    setup.remove_atom(0)
    assert [a[0] for a in setup.spec.system.atoms] == ["H", "H"]
    history.undo()
    history.undo()
    assert setup.spec == studies.study()


def test_an_empty_set_up_says_that_there_is_no_system():
    setup = SetupEditing(History())
    assert not setup.has_system
    assert "no system" in setup.obstacle


def test_a_new_system_keeps_all_other_sections(setup):
    setup.edit("seed", "9")
    setup.replace_system(Integrals(name="x", listing="&FCI &END"), "opening")
    assert isinstance(setup.spec.system, Integrals)
    assert setup.spec.seed == 9


def test_what_a_calculation_refuses_is_marked_until_the_settings_change(setup):
    spec = setup.spec
    setup.refuse(spec, StudyError("Too many electrons", "they do not fit", "Take fewer", "system.active_space"))
    assert "system.active_space" in setup.errors
    setup.edit("system.charge", "1")
    assert not setup.errors


def test_a_refusal_of_older_settings_is_not_shown(setup):
    old = setup.spec
    setup.edit("system.charge", "1")
    setup.refuse(old, StudyError("a", "b", "c", "system.charge"))
    assert not setup.errors


def test_use_of_a_run_can_be_undone():
    history = History()
    setup = SetupEditing(history, studies.study())
    setup.use(studies.other_study(), "use of run 2's set-up")
    assert setup.spec == studies.other_study()
    history.undo()
    assert setup.spec == studies.study()


def test_a_molecule_without_atoms_is_no_system(setup):
    setup.replace_system(Molecule(), "nothing")
    assert not setup.has_system
