"""Matrix elements between determinants against two independent second-quantised Hamiltonians."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest
from pyscf import fci
from support.molecules import random_hamiltonian
from support.second_quantised import hamiltonian_matrix

from thalweg.operators.slater_condon import determinant_matrix


def strings(m, n):
    return sorted(sum(1 << p for p in chosen) for chosen in combinations(range(m), n))


@pytest.mark.parametrize(("m", "n_alpha", "n_beta"), [(4, 2, 2), (5, 3, 1), (4, 0, 2), (3, 3, 3)])
def test_every_element_agrees_with_matrices_of_ladder_operators(m, n_alpha, n_beta):
    h = random_hamiltonian(m, n_alpha, n_beta, seed=7)
    determinants = [(a, b) for a in strings(m, n_alpha) for b in strings(m, n_beta)]
    assert np.allclose(determinant_matrix(h, determinants), hamiltonian_matrix(h), rtol=0, atol=1e-12)


def test_elements_agree_with_the_contraction_of_pyscf():
    """PySCF, `fci.direct_spin1`: an independent full-CI code with the same order of strings."""
    m, electrons = 5, (3, 2)
    h = random_hamiltonian(m, *electrons, seed=3)
    determinants = [(a, b) for a in strings(m, 3) for b in strings(m, 2)]
    absorbed = fci.direct_spin1.absorb_h1e(h.one_body, h.two_body, m, electrons, 0.5)
    chosen = np.random.default_rng(4).choice(len(determinants), 12, replace=False)
    matrix = determinant_matrix(h, [determinants[i] for i in chosen]) - h.core_energy * np.eye(12)
    for column, i in enumerate(chosen):
        unit = np.zeros(len(determinants))
        unit[i] = 1.0
        image = fci.direct_spin1.contract_2e(absorbed, unit.reshape(10, 10), m, electrons).ravel()
        assert np.allclose(matrix[:, column], image[chosen], rtol=0, atol=1e-12)
