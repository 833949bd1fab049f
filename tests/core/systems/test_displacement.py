"""Internal coordinates reach the value asked for and move only what they should."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from thalweg.systems.displacement import (
    angle_degrees,
    breathed,
    dihedral_degrees,
    moving_fragment,
    set_angle,
    set_dihedral,
    set_distance,
)

WATER = np.array([[0.0, 0.0, 0.0], [0.96, 0.0, 0.0], [-0.24, 0.93, 0.0]])
# H-O-O-H, torsion 90 degrees by construction
PEROXIDE = np.array([[1.0, 1.0, 0.0], [1.0, 0.0, 0.0], [-1.0, 0.0, 0.0], [-1.0, 0.0, 1.0]])
PEROXIDE_BONDS = [(0, 1), (1, 2), (2, 3)]


def test_cutting_a_bond_moves_the_whole_fragment():
    assert moving_fragment(4, PEROXIDE_BONDS, 1, 2) == (2, 3)
    assert moving_fragment(4, PEROXIDE_BONDS, 2, 1) == (0, 1)


def test_in_a_ring_only_the_named_atom_moves():
    assert moving_fragment(3, [(0, 1), (1, 2), (2, 0)], 0, 1) == (1,)


def test_a_bond_takes_the_length_asked_for():
    out = set_distance(PEROXIDE, 1, 2, 3.5, (2, 3))
    assert np.linalg.norm(out[2] - out[1]) == pytest.approx(3.5)
    assert np.linalg.norm(out[3] - out[2]) == pytest.approx(1.0)
    assert np.array_equal(out[:2], PEROXIDE[:2])


@settings(max_examples=50, deadline=None)
@given(st.floats(5, 175))
def test_an_angle_takes_the_value_asked_for(degrees):
    out = set_angle(WATER, 1, 0, 2, degrees, (2,))
    assert angle_degrees(out, 1, 0, 2) == pytest.approx(degrees)
    assert np.linalg.norm(out[2]) == pytest.approx(np.linalg.norm(WATER[2]))


def test_a_straight_molecule_can_be_bent():
    straight = np.array([[0.0, 0, 0], [1.0, 0, 0], [-1.0, 0, 0]])
    assert angle_degrees(set_angle(straight, 1, 0, 2, 120.0, (2,)), 1, 0, 2) == pytest.approx(120.0)


@settings(max_examples=50, deadline=None)
@given(st.floats(-179, 179))
def test_a_dihedral_takes_the_value_asked_for(degrees):
    out = set_dihedral(PEROXIDE, 0, 1, 2, 3, degrees, (3,))
    assert dihedral_degrees(out, 0, 1, 2, 3) == pytest.approx(degrees, abs=1e-9)


def test_the_sign_of_a_dihedral_follows_iupac():
    # IUPAC Gold Book, torsion angle: positive when the front bond turns clockwise to eclipse the rear one. Looking from atom 1 to
    # atom 2 (along -x) with +y up, right is -z; the rear bond points to +z, left, so the turn is counter-clockwise.
    assert dihedral_degrees(PEROXIDE, 0, 1, 2, 3) == pytest.approx(-90.0)
    assert dihedral_degrees(PEROXIDE * np.array([1, 1, -1]), 0, 1, 2, 3) == pytest.approx(90.0)


def test_breathing_scales_every_distance():
    out = breathed(WATER, 1.5)
    before = np.linalg.norm(WATER[:, None] - WATER[None], axis=-1)
    after = np.linalg.norm(out[:, None] - out[None], axis=-1)
    assert np.allclose(after, 1.5 * before)
    assert np.allclose(out.mean(axis=0), WATER.mean(axis=0))
