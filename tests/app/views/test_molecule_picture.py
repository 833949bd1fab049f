import numpy as np
import pytest
from PySide6.QtCore import QPoint, Qt
from PySide6.QtTest import QTest

from thalweg_app.views.molecule_picture import MoleculePicture

WATER = (("O", 0.0, 0.0, 0.1173), ("H", 0.0, 0.7572, -0.4692), ("H", 0.0, -0.7572, -0.4692))


@pytest.fixture
def picture(qtbot):
    made = MoleculePicture()
    qtbot.addWidget(made)
    made.resize(360, 150)
    made.show_atoms(WATER, "angstrom")
    made.show()
    return made


def test_bonds_are_found_and_measured_in_both_units(picture):
    assert picture._bonds == ((0, 1), (0, 2))
    assert picture.bond_length((0, 1)) == "O 1 – H 2: 0.9578 Å = 1.8099 bohr"


def test_the_pointer_finds_atoms_and_bonds(picture):
    balls = picture._balls()
    assert picture.atom_at(balls[0].at) == 0
    assert picture.bond_at(balls[0].at * 0.45 + balls[1].at * 0.55) == (0, 1)
    assert picture.atom_at(balls[0].at * 0) is None


def test_dragging_turns_without_changing_lengths(picture):
    before = picture._turn.copy()
    QTest.mousePress(picture, Qt.MouseButton.LeftButton, pos=QPoint(100, 70))
    QTest.mouseMove(picture, QPoint(160, 90))
    QTest.mouseRelease(picture, Qt.MouseButton.LeftButton, pos=QPoint(160, 90))
    assert not np.allclose(picture._turn, before)
    np.testing.assert_allclose(picture._turn @ picture._turn.T, np.eye(3), atol=1e-12)
    QTest.mouseDClick(picture, Qt.MouseButton.LeftButton, pos=QPoint(160, 90))
    np.testing.assert_allclose(picture._turn, before)


def test_the_arrow_keys_turn_and_plus_enlarges(picture):
    before, zoom = picture._turn.copy(), picture._zoom
    QTest.keyClick(picture, Qt.Key.Key_Left)
    QTest.keyClick(picture, Qt.Key.Key_Plus)
    assert not np.allclose(picture._turn, before)
    assert picture._zoom > zoom


def test_every_atom_stays_inside_the_picture(picture):
    for _ in range(30):
        QTest.keyClick(picture, Qt.Key.Key_Right)
        QTest.keyClick(picture, Qt.Key.Key_Down)
        for ball in picture._balls():
            assert picture.rect().contains(ball.at.toPoint())


@pytest.mark.parametrize("atoms", [(), (("H", 0.0, 0.0, 0.0),), (("Xx", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.0)), (("U", 0, 0, 0), ("O", 0, 0, 1.8))])
def test_whatever_the_atoms_are_something_is_drawn(picture, atoms):
    picture.show_atoms(atoms, "angstrom")
    assert not picture.grab().isNull()
