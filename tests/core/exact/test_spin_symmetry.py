"""Groups of translations and spin inversion: orders, characters, momenta in words."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

from thalweg.exact.spin_symmetry import momentum_text, order_of, symmetry_group
from thalweg.systems.lattice import Chain, Honeycomb, Kagome, Square, Triangular
from thalweg.systems.spin_models import XXZ, Heisenberg, Ising

TORI = [Chain(sites=6), Chain(sites=7), Square(columns=4, rows=3), Triangular(columns=6, rows=2, shift=2), Honeycomb(columns=3, rows=2), Kagome()]


@pytest.mark.parametrize("lattice", TORI, ids=str)
@pytest.mark.parametrize("inversion", [False, True])
def test_characters_are_orthogonal_and_complete(lattice, inversion):
    expansion, moves = Heisenberg().hamiltonian(lattice), lattice.build().translations
    group = symmetry_group(expansion, moves, with_inversion=inversion, real=False)
    cells = lattice.build().n_sites // {"honeycomb": 2, "kagome": 3}.get(lattice.key, 1)
    assert group.order == cells * (2 if inversion else 1)
    table = np.array([character.values for character in group.characters])
    assert np.allclose(table @ table.conj().T, group.order * np.eye(group.order), atol=1e-10)
    assert group.permutations[0].tolist() == list(range(expansion.n_qubits))
    assert not group.inverts[0]


@pytest.mark.parametrize("lattice", TORI, ids=str)
def test_of_complex_pairs_one_stands_for_both_where_h_is_real(lattice):
    expansion, moves = Heisenberg().hamiltonian(lattice), lattice.build().translations
    group = symmetry_group(expansion, moves, with_inversion=True, real=True)
    assert sum(character.pairs for character in group.characters) == group.order
    for character in group.characters:
        assert (character.values.dtype.kind == "c") == (character.pairs == 2)


def test_spin_inversion_needs_a_hamiltonian_that_has_it():
    moves = Chain(sites=4).build().translations
    assert symmetry_group(XXZ(field=0.1).hamiltonian(Chain(sites=4)), moves, with_inversion=True, real=True).order == 4
    assert symmetry_group(Ising().hamiltonian(Chain(sites=4)), moves, with_inversion=True, real=True).order == 8


def test_a_group_too_large_for_a_word_is_made_smaller():
    lattice = Square(columns=9, rows=6)
    group = symmetry_group(Heisenberg().hamiltonian(lattice), lattice.build().translations, with_inversion=True, real=True)
    assert group.order == 54
    assert not group.inverts.any()


def test_momenta_are_fractions_of_a_full_turn():
    assert [momentum_text(Fraction(k, 6)) for k in range(6)] == ["0", "pi/3", "2 pi/3", "pi", "4 pi/3", "5 pi/3"]
    assert order_of((1, 2, 0, 4, 3)) == 6
