"""Active spaces are read as people write them, and impossible ones are refused."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from support.molecules import random_hamiltonian

from thalweg.errors import StudyError
from thalweg.systems.active_space import choose_active_space, cut_degeneracies, fold_core

CLOSED = np.array([2.0, 2, 2, 0, 0, 0])
OPEN = np.array([2.0, 2, 1, 1, 0, 0])
ENERGIES = np.arange(6.0)


@pytest.mark.parametrize(
    ("text", "core", "active", "electrons"),
    [
        ("all", (), (0, 1, 2, 3, 4, 5), 6),
        ("", (), (0, 1, 2, 3, 4, 5), 6),
        ("frozen-core", (0,), (1, 2, 3, 4, 5), 4),
        ("Frozen core", (0,), (1, 2, 3, 4, 5), 4),
        ("4e,4o", (0,), (1, 2, 3, 4), 4),
        (" ( 4e , 4o ) ", (0,), (1, 2, 3, 4), 4),
        ("2E 2O", (0, 1), (2, 3), 2),
        ("2,3,5-6", (0,), (1, 2, 4, 5), 4),
        ("2 - 4", (0,), (1, 2, 3), 4),
        ("[3, 4]", (0, 1), (2, 3), 2),
    ],
)
def test_descriptions(text, core, active, electrons):
    space = choose_active_space(text, CLOSED, ENERGIES, 1)
    assert (space.core, space.active, space.n_electrons) == (core, active, electrons)
    assert space.rule


def test_singly_occupied_orbitals_stay_active():
    space = choose_active_space("2e,3o", OPEN, ENERGIES, 1)
    assert (space.active, space.n_alpha, space.n_beta) == ((2, 3, 4), 2, 0)
    with pytest.raises(StudyError, match="singly occupied"):
        choose_active_space("2,4-6", OPEN, ENERGIES, 1)
    with pytest.raises(StudyError, match="frozen orbitals hold two electrons"):
        choose_active_space("1e,3o", OPEN, ENERGIES, 1)


def test_orbitals_in_another_order_are_chosen_by_energy():
    occupation, energies = np.array([0.0, 2, 0, 2]), np.array([2.0, -1, 1, -2])
    space = choose_active_space("2e,2o", occupation, energies, None)
    assert (space.core, space.active) == ((3,), (1, 2))


@pytest.mark.parametrize("text", ["8e,6o", "5e,5o", "0e,3o", "4e,6o", "4e,1o", "7", "0", "3-2", "1,1-2", "2-", "core", "4,5,6", "4e", "-1", "1;;x"])
def test_impossible_spaces_are_refused_with_the_field(text):
    with pytest.raises(StudyError) as caught:
        choose_active_space(text, CLOSED, ENERGIES, 1)
    assert caught.value.field == "system.active_space"


def test_a_core_that_is_unknown_or_not_filled_cannot_be_frozen():
    with pytest.raises(StudyError, match="by rule"):
        choose_active_space("frozen-core", CLOSED, ENERGIES, None)
    with pytest.raises(StudyError, match="not doubly occupied"):
        choose_active_space("frozen-core", CLOSED, ENERGIES, 4)
    with pytest.raises(StudyError, match="no electrons"):
        choose_active_space("frozen-core", CLOSED, ENERGIES, 3)


@settings(deadline=None)
@given(st.text(max_size=30) | st.from_regex(r"[0-9eo,\- ()]{0,12}", fullmatch=True))
def test_any_text_gives_a_space_or_a_sentence(text):
    try:
        space = choose_active_space(text, OPEN, ENERGIES, 1)
    except StudyError:
        return
    assert set(space.core).isdisjoint(space.active)
    assert 2 * len(space.core) + space.n_electrons == 6


def test_cutting_a_degenerate_pair_is_told():
    energies = np.array([0.0, 1, 1, 2, 2, 3])
    space = choose_active_space("2-4", np.array([2.0, 2, 2, 0, 0, 0]), energies, None)
    assert len(cut_degeneracies(space, energies)) == 1
    assert "Orbitals 4 and 5" in cut_degeneracies(space, energies)[0]


def test_freezing_keeps_the_energy_of_every_determinant_with_a_filled_core():
    whole = random_hamiltonian(5, 3, 2, seed=4)
    space = choose_active_space("2-5", np.array([2.0, 2, 1, 0, 0]), np.arange(5.0), None)
    energy, one_body, two_body = fold_core(whole.core_energy, whole.one_body, whole.two_body, space)
    folded = type(whole)(energy, one_body, two_body, np.zeros(4, np.int64), type(whole.sector)(4, 2, 1), (0, 0), np.empty(0))
    for alpha, beta in ((0b0011, 0b0001), (0b1010, 0b0100), (0b1100, 0b1000)):
        assert folded.determinant_energy(alpha, beta) == pytest.approx(whole.determinant_energy(alpha << 1 | 1, beta << 1 | 1), abs=1e-10)
