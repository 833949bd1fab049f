"""The window driven through whole studies: a lattice, a curve, a diagnosis. Jobs run at once in the test's own process."""

import pytest
import windows
from instant_starter import InstantStarter
from PySide6.QtCore import QPoint, Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QFileDialog

from thalweg.storage.session import load_session
from thalweg.study.spec import StudySpec
from thalweg.systems import LatticeModel, Molecule
from thalweg_app.plots.curve import CurvePicture
from thalweg_app.plots.diagnosis import DiagnosisPicture
from thalweg_app.plots.state import StatePicture


@pytest.fixture
def window(qtbot, tmp_path):
    made = windows.make(qtbot, tmp_path, InstantStarter(), scan="instant_starter:scan_here")
    made.workbench.setup.load(StudySpec(system=Molecule(name="H2", atoms=(("H", 0, 0, 0), ("H", 0, 0, 0.74)))))
    made.workbench.document.mark_pristine()
    return made


def picture(window, kind):
    index = next(i for i, p in enumerate(window.pictures) if isinstance(p, kind))
    window.show_picture(index)
    return window.pictures[index]


def choose(combo, key):
    combo.setCurrentIndex(combo.findData(key))
    combo.activated.emit(combo.currentIndex())


def type_into(entry, text):
    entry.setFocus()
    entry.selectAll()
    QTest.keyClicks(entry, text)
    QTest.keyClick(entry, Qt.Key.Key_Return)


def build_ring(window, sites):
    section = window.column.system
    choose(section.kind, "lattice")
    type_into(section.lattice.lattice._forms["chain"].editor("system.lattice.sites"), str(sites))
    return section.lattice


def test_a_ring_is_built_run_and_judged(window):
    lattice = build_ring(window, 6)
    assert isinstance(window.workbench.setup.spec.system, LatticeModel)
    assert not getattr(window.workbench.setup.spec.ansatz, "electrons_only", False)  # spins have no use for UCCSD
    assert "6 sites; bonds: 6 nearest" in lattice._facts.text()
    assert "S_i.S_j" in lattice._facts.text()  # the convention is in sight
    window.column.run_button.click()
    assert "Reaches the target" in window.column.answer.text
    state = picture(window, StatePicture)
    assert not state.lattice.isHidden()
    choose(state.listed, "correlations")
    assert state.table.model().rowCount() == 15
    first = [state.table.model().index(0, c).data() for c in range(3)]
    assert first[:2] == ["0 – 1", "nearest"]
    assert float(first[2].replace("−", "-")) == pytest.approx(-0.46713, abs=2e-3)  # energy per bond of the ring of six (closed form)


def test_the_lattice_picture_tells_sites_and_bonds(window):
    lattice = build_ring(window, 6)
    shown = lattice.picture
    places = shown._places(shown._graph)
    assert shown.told_at(QPoint(*map(round, places[2])).toPointF()).startswith("Site 2")
    middle = (places[0] + places[1]) / 2
    assert "Bond 0 – 1, nearest" in shown.told_at(QPoint(*map(round, middle)).toPointF())
    assert not shown.grab().isNull()


def test_a_lattice_that_cannot_be_says_why_and_nothing_is_lost(window):
    lattice = build_ring(window, 6)
    entry = lattice.lattice._forms["chain"].editor("system.lattice.sites")
    type_into(entry, "-3")
    assert window.workbench.setup.obstacle
    assert not window.column.run_button.isEnabled()
    assert entry.text() == "-3"
    window.workbench.history.undo()
    assert window.workbench.setup.obstacle == ""


def test_switching_back_to_the_molecule_brings_it_back(window):
    build_ring(window, 6)
    choose(window.column.system.kind, "molecule")
    assert window.workbench.setup.spec.system.name == "H2"


def test_a_curve_is_scanned_drawn_listed_and_saved(window, tmp_path):
    curve = picture(window, CurvePicture)
    for name, text in (("first", "0.6"), ("last", "1.2"), ("count", "7")):
        type_into(curve.form._entries[name], text)
    curve.form.start.click()
    assert "Reaches the target at all 7 points" in curve.sentence.text()
    assert not curve.view.chart.is_empty
    assert curve.table.model().rowCount() == 7
    assert curve.yields.model().rowCount() >= 2
    assert window.workbench.document.is_dirty
    curve.view.chosen.emit(0.75)  # a click on a point opens its convergence
    assert window.picture.title == "Convergence"
    assert window.picture.view.chart.panels[0].series[-1].name.startswith("H1-H2 distance 0.7")
    path = window.workbench.document.save(tmp_path / "curve")
    window.workbench.document.start_new()
    assert window.workbench.scans.scans == ()
    window.workbench.document.take(load_session(path), path)
    assert len(window.workbench.scans.chosen.result.points) == 7


def test_two_atoms_picked_in_the_picture_make_the_bond(window):
    balls = window.column.system.picture
    for ball in balls._balls():
        QTest.mouseClick(balls, Qt.MouseButton.LeftButton, pos=ball.at.toPoint())
    path = window.workbench.scans.draft.path
    assert {path.first, path.second} == {1, 2}


def test_a_scan_that_cannot_start_says_why_in_the_form(window):
    curve = picture(window, CurvePicture)
    type_into(curve.form._entries["count"], "1")
    assert "make no curve" in curve.form.trouble.text()
    assert not curve.form.start.isEnabled()


def test_a_diagnosis_is_asked_and_answered(window):
    build_ring(window, 4)
    diagnosis = picture(window, DiagnosisPicture)
    window.workbench.diagnosis.edit("samples", "20")
    window.workbench.diagnosis.edit("layers", "1 2")
    diagnosis.start.click()
    assert diagnosis.sentence.text()
    assert not diagnosis.view.chart.is_empty
    assert diagnosis.table.model().rowCount() >= 2


def test_a_landscape_over_two_directions_is_a_map(window):
    build_ring(window, 4)
    window.column.run_button.click()
    diagnosis = picture(window, DiagnosisPicture)
    for name, value in (("what", "landscape"), ("second", "steepest"), ("points", "5")):
        window.workbench.diagnosis.edit(name, value)
    diagnosis.start.click()
    assert diagnosis.stack.currentWidget() is diagnosis.map
    assert diagnosis.sentence.text()


def test_the_frames_of_a_file_are_chosen_by_dialog_and_run(qtbot, window, tmp_path):
    file = tmp_path / "stretch.xyz"
    file.write_text("".join(f"2\n\nH 0 0 0\nH 0 0 {r}\n" for r in (0.7, 0.8, 0.9)))
    form = picture(window, CurvePicture).form
    choose(form.path, "frames")
    assert form.frames.isVisible()
    assert not form.spacing.isVisible()
    assert "No frames are chosen" in form.trouble.text()
    form.frames.choose.click()
    windows.dialog(window, QFileDialog).fileSelected.emit(str(file))
    assert form.frames.file.text() == "stretch.xyz: 3 frames, read in ångström"
    form.start.click()
    result = window.workbench.scans.chosen.result
    assert [p.coordinate for p in result.points] == [1.0, 2.0, 3.0]
    assert result.axis == "Frame"
    choose(form.path, "bond")
    assert form.spacing.isVisible()
    assert not form.frames.isVisible()


def test_frames_of_another_molecule_are_refused_in_a_sentence(window, tmp_path):
    (tmp_path / "other.xyz").write_text("2\n\nH 0 0 0\nH 0 0 0.7\n2\n\nLi 0 0 0\nH 0 0 1.6\n")
    form = picture(window, CurvePicture).form
    window.workbench.scans.open_frames(tmp_path / "other.xyz")
    assert form.trouble.text().startswith("Frame 2 of other.xyz has other atoms")
    assert not form.start.isEnabled()
