"""Hamiltonians and Pauli expansions as data."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from support.molecules import stored_molecule

from thalweg.operators.fermion import Sector
from thalweg.operators.pauli import collect_terms, pauli_label


@given(st.lists(st.tuples(st.integers(0, 7), st.integers(0, 7), st.integers(-3, 3)), max_size=40), st.sampled_from([0.0, 1.5]))
def test_equal_strings_add_up_small_ones_go_and_the_rest_is_sorted(terms, cut):
    x, z = (np.array([t[i] for t in terms], np.uint64) for i in (0, 1))
    expansion = collect_terms(3, x, z, np.array([t[2] for t in terms], float), cut)
    expected: dict[tuple[int, int], float] = {}
    for a, b, c in terms:
        expected[a, b] = expected.get((a, b), 0.0) + c
    expected = {key: c for key, c in expected.items() if abs(c) > cut}
    found = dict(zip(zip(expansion.x.tolist(), expansion.z.tolist(), strict=True), expansion.coefficients.tolist(), strict=True))
    assert found == expected
    assert list(found) == sorted(found)
    assert expansion.cut == cut


def test_figures_leave_the_identity_out_of_the_one_norm():
    expansion = collect_terms(62, np.array([0, 1 << 61, 3], np.uint64), np.array([0, 1 << 61, 4], np.uint64), np.array([-5.0, 0.5, -0.25]))
    assert (len(expansion), expansion.identity, expansion.one_norm, expansion.largest_weight) == (3, -5.0, 0.75, 3)
    assert list(expansion.labels()) == ["I", "X0 X1 Z2", "Y61"]
    assert collect_terms(2, np.empty(0, np.uint64), np.empty(0, np.uint64), np.empty(0)).one_norm == 0


def test_labels_name_letters_by_qubit():
    assert pauli_label(0b0101, 0b0110) == "X0 Z1 Y2"


def test_reference_energy_is_the_stored_mean_field_energy():
    data, hamiltonian = stored_molecule("H1-Li1_sto-3g_singlet_1.45")
    assert hamiltonian.reference_energy == pytest.approx(data.hf_energy, abs=5e-8)


def test_sector_counts_strings_and_states():
    sector = Sector(6, 2, 3)
    assert (sector.shape, sector.dimension, sector.n_electrons, sector.s_z) == ((15, 20), 300, 5, -0.5)
    assert str(sector) == "2 alpha + 3 beta electrons in 6 orbitals"


def test_degenerate_orbitals_are_noticed():
    _, hamiltonian = stored_molecule("H1-Li1_sto-3g_singlet_1.45")
    assert hamiltonian.orbitals_are_degenerate()
    assert not replace(hamiltonian, orbital_energies=np.array([-1.0, 0.5])).orbitals_are_degenerate()
    assert not replace(hamiltonian, orbital_energies=np.empty(0)).orbitals_are_degenerate()
