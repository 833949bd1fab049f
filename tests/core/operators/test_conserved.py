"""What an expansion commutes with, against commutators of matrices."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from support.dense import expansion_matrix, string_matrix

from thalweg.operators.conserved import (
    conserved_quantities,
    conserves_parity,
    conserves_total_spin_along,
    is_diagonal,
    is_invariant,
    is_real,
    permuted_masks,
)
from thalweg.operators.pauli import PauliExpansion, collect_terms

N = 3
AXES = {"x": (1, 0), "y": (1, 1), "z": (0, 1)}
masks = st.integers(0, 2**N - 1)
expansions = st.lists(st.tuples(masks, masks, st.sampled_from([-1.0, 0.5, 1.0, 2.0])), min_size=1, max_size=6)


def expansion_of(terms) -> PauliExpansion:
    x, z, c = (np.array(column) for column in zip(*terms, strict=True))
    return collect_terms(N, x.astype(np.uint64), z.astype(np.uint64), c.astype(float))


def commute(a: np.ndarray, b: np.ndarray) -> bool:
    return bool(np.abs(a @ b - b @ a).max(initial=0.0) < 1e-12)


exchange = [(3, 0, 1.0), (3, 3, 1.0), (0, 3, 1.0)]


@settings(deadline=None)
@given(expansions | expansions.map(lambda terms: terms + exchange) | st.just(exchange))
def test_spin_and_parity_are_judged_as_the_matrices_are(terms):
    expansion = expansion_of(terms)
    matrix = expansion_matrix(expansion)
    for axis, (x, z) in AXES.items():
        total = sum(string_matrix(N, x << q, z << q) for q in range(N))
        assert conserves_total_spin_along(expansion, axis) == commute(matrix, total)
        assert conserves_parity(expansion, axis) == commute(matrix, string_matrix(N, x * 7, z * 7))
    assert is_real(expansion) == bool(np.abs(matrix.imag).max() < 1e-14)
    assert is_diagonal(expansion) == bool(np.abs(matrix - np.diag(np.diag(matrix))).max() < 1e-14)


def test_terms_that_only_together_conserve_s_z_are_recognised():
    pair = expansion_of([(3, 0, 1.0), (3, 3, 1.0)])
    assert conserves_total_spin_along(pair, "z")
    assert not conserves_total_spin_along(expansion_of([(3, 0, 1.0), (3, 3, 0.999)]), "z")
    assert not conserves_total_spin_along(expansion_of([(3, 0, 1.0)]), "z")


@pytest.mark.parametrize(
    ("terms", "said"),
    [
        (exchange, ("total spin S", "S_z")),
        ([(3, 0, 1.0), (3, 3, 1.0)], ("S_z", "parity prod X", "parity prod Y")),
        ([(0, 3, 1.0), (1, 0, 1.0), (2, 0, 1.0)], ("parity prod X",)),
        ([(1, 0, 1.0), (0, 1, 1.0)], ()),
    ],
)
def test_conserved_quantities_are_named(terms, said):
    found = conserved_quantities(expansion_of(terms))
    assert found == said


def test_masks_and_expansions_follow_a_permutation():
    assert permuted_masks(np.array([0b001, 0b110], dtype=np.uint64), (2, 0, 1)).tolist() == [0b100, 0b011]
    ring = expansion_of([(0b011, 0, 1.0), (0b110, 0, 1.0), (0b101, 0, 1.0)])
    assert is_invariant(ring, (1, 2, 0))
    assert not is_invariant(expansion_of([(0b011, 0, 1.0), (0b110, 0, 2.0), (0b101, 0, 1.0)]), (1, 2, 0))
