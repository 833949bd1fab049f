"""H on sector amplitudes: sparse rows and the matrix-free product against dense second quantisation and each other."""

from __future__ import annotations

import numpy as np
import pytest
from support.hamiltonians import random_molecule
from support.second_quantised import hamiltonian_matrix

from thalweg.errors import Stopped
from thalweg.operators.sector_hamiltonian import SectorHamiltonian, estimated_bytes, group_order
from thalweg.operators.sector_layout import layout_of
from thalweg.watch import Watch

SMALL = [
    (1, 1, 0, ()),
    (1, 1, 1, ()),
    (2, 1, 1, (0, 1)),
    (3, 0, 2, (0, 1, 0)),
    (3, 3, 3, ()),
    (4, 3, 1, (0, 0, 1, 1)),
    (4, 2, 2, (0, 1, 2, 3)),
    (5, 2, 3, (0, 1, 0, 2, 1)),
]
# more than 8, 16 and 32 rows packed at once, and remainders of every kind
LARGE = [(8, 4, 4, ()), (8, 4, 3, (0, 1, 0, 1, 1, 0, 1, 0)), (7, 3, 4, (0, 1, 2, 4, 7, 3, 0)), (9, 1, 4, ()), (9, 4, 0, (0, 1) * 4 + (0,))]


@pytest.mark.parametrize("case", SMALL)
@pytest.mark.parametrize("sparse_limit", [0, 10_000])
def test_every_irrep_agrees_with_dense_second_quantisation(case, sparse_limit):
    h = random_molecule(*case)
    dense = hamiltonian_matrix(h) - h.core_energy * np.eye(h.sector.dimension)
    product = SectorHamiltonian(h, sparse_limit)
    covered = 0
    for irrep in range(product.n_irreps):
        block = product.block(irrep)
        for column in np.eye(block.layout.size):
            image = block.layout.to_matrix(block.apply(column)).ravel()
            assert np.allclose(image, dense @ block.layout.to_matrix(column).ravel(), atol=1e-11)
        covered += block.layout.size
    assert covered == h.sector.dimension


@pytest.mark.parametrize("case", LARGE)
def test_matrix_free_and_sparse_products_agree(case):
    h = random_molecule(*case)
    rows, free = SectorHamiltonian(h), SectorHamiltonian(h, sparse_limit=0)
    rng = np.random.default_rng(1)
    for irrep in range(rows.n_irreps):
        layout = rows.block(irrep).layout
        vector = rng.normal(size=layout.size)
        expected = rows.block(irrep).apply(vector)
        assert np.allclose(free.block(irrep).apply(vector), expected, rtol=0, atol=1e-12 * max(1.0, np.abs(expected).max(initial=0.0)))
        whole = rows.whole.layout.from_matrix(layout.to_matrix(vector))
        assert np.allclose(free.whole.layout.to_matrix(free.whole.apply(whole)), layout.to_matrix(expected), atol=1e-10)


@pytest.mark.parametrize("case", [*SMALL, *LARGE[1:3]])
def test_diagonal_is_that_of_determinants(case):
    h = random_molecule(*case)
    block = SectorHamiltonian(h).block(0)
    alphas, betas = block.layout.masks(np.arange(block.layout.size))
    expected = [h.determinant_energy(int(a), int(b)) - h.core_energy for a, b in zip(alphas[:40], betas[:40], strict=True)]
    assert np.allclose(block.diagonal[:40], expected, atol=1e-10)


@pytest.mark.parametrize("case", [*SMALL, *LARGE])
def test_layouts_carry_matrices_there_and_back(case):
    h = random_molecule(*case)
    matrix = np.random.default_rng(1).normal(size=h.sector.shape)
    product = SectorHamiltonian(h)
    layouts = [product.block(irrep).layout for irrep in range(product.n_irreps)]
    assert np.array_equal(sum(layout.to_matrix(layout.from_matrix(matrix)) for layout in layouts), matrix)
    for layout in layouts:
        assert np.array_equal(layout_of(layout.key).row_start, layout.row_start)
        if layout.size:
            last = layout.size - 1
            alphas, betas = layout.masks(np.array([0, last]))
            assert [layout.index(int(a), int(b)) for a, b in zip(alphas, betas, strict=True)] == [0, last]


def test_a_determinant_of_another_irrep_has_no_place():
    h = random_molecule(2, 1, 1, (0, 1))
    layout = SectorHamiltonian(h).block(0).layout
    with pytest.raises(KeyError):
        layout.index(0b01, 0b10)


def test_the_irreps_that_orbitals_reach_are_counted():
    assert [group_order(np.array(labels)) for labels in ([], [0, 0], [0, 5], [1, 2], [1, 2, 4])] == [1, 1, 2, 4, 8]


@pytest.mark.parametrize("sparse_limit", [0, 10**6])
def test_the_estimate_of_memory_is_near_what_is_taken(sparse_limit):
    h = random_molecule(8, 4, 4)
    block = SectorHamiltonian(h, sparse_limit).whole
    block.apply(np.ones(block.layout.size))
    arrays = list(block.rows) if sparse_limit else list(block._alpha.dense) * 2
    arrays += [a for part in (block._alpha, block._beta) for a in (*part.singles, *part.doubles)]
    taken = sum(a.nbytes for a in arrays)
    assert 0.5 * taken < estimated_bytes(h.sector, 1, sparse_limit=sparse_limit) < 2.0 * taken


def test_a_stop_is_heard_within_a_product():
    block = SectorHamiltonian(random_molecule(6, 3, 3), sparse_limit=0).whole
    with pytest.raises(Stopped):
        block.apply(np.ones(block.layout.size), None, Watch(should_stop=lambda: True))
