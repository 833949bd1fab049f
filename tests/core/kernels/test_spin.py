"""Ranked bases, orbits and the action of H on them, against plain loops."""

from __future__ import annotations

from math import comb

import numpy as np
import pytest
from support.dense import sparse_matrix

from thalweg.exact.spin_basis import basis_of, sorted_strings
from thalweg.exact.spin_blocks import OrbitBlock, RegisterBlock, RunsBlock, constant_exchange, inverted_half, orbit_tables
from thalweg.exact.spin_symmetry import byte_tables, symmetry_group
from thalweg.kernels import lanczos, spin_orbits
from thalweg.kernels import spin as kernels
from thalweg.operators.pauli import collect_terms
from thalweg.systems.lattice import Chain, Kagome, Ladder, Square
from thalweg.systems.pauli_list import PauliList
from thalweg.systems.spin_models import XXZ, Heisenberg, Ising, RandomCouplings
from thalweg.watch import SILENT

RNG = np.random.default_rng(5)


@pytest.mark.parametrize("n", [1, 2, 5, 8, 11])
def test_every_sector_is_listed_in_order_and_ranked(n):
    for down in range(n + 1):
        basis = basis_of(n, down)
        want = [s for s in range(1 << n) if s.bit_count() == down]
        assert basis.dimension == comb(n, down)
        assert basis.states.tolist() == want
        assert [kernels.rank_state(s, basis.bits, basis.offset, basis.rank) for s in basis.states] == list(range(len(want)))


def test_byte_tables_move_bits():
    permutation = RNG.permutation(21)
    tables = byte_tables(permutation)
    for state in RNG.integers(0, 1 << 21, 50).tolist():
        want = sum(1 << int(permutation[q]) for q in range(21) if state >> q & 1)
        assert int(spin_orbits.moved(np.uint64(state), tables)) == want


@pytest.mark.parametrize(
    "lattice", [Chain(sites=9), Ladder(rungs=5), Kagome(columns=3, rows=1, periodic_y=False), Square(columns=5, rows=2)], ids=str
)
@pytest.mark.parametrize("model", [Heisenberg(), XXZ(delta=0.3, field=0.2), RandomCouplings(field_spread=1.0)], ids=lambda m: m.key)
def test_exchange_in_runs_is_the_block_of_the_matrix(model, lattice):
    expansion = model.hamiltonian(lattice)
    matrix = sparse_matrix(expansion).real.tocsr()
    for down in range(expansion.n_qubits + 1):
        basis = basis_of(expansion.n_qubits, down)
        block = RunsBlock(basis, sorted_strings(expansion), SILENT)
        v, out = RNG.normal(size=basis.dimension), np.empty(basis.dimension)
        block.apply(v, out)
        places = basis.register_indices()
        assert np.allclose(out, matrix[places][:, places] @ v, atol=1e-12)


def test_runs_take_exchange_of_four_sites_as_well():
    """(S+S+S-S- + h.c.) on four sites keeps S_z: two more bits flipped than a pair does."""
    ring = PauliList(terms="X0 X2 X5 X7 + Y0 Y2 Y5 Y7 + Z1 Z3").hamiltonian(Chain(sites=8))
    strings = sorted_strings(ring)
    assert constant_exchange(strings) is not None
    basis = basis_of(8, 4)
    block = RunsBlock(basis, strings, SILENT)
    v, out = RNG.normal(size=basis.dimension), np.empty(basis.dimension)
    block.apply(v, out)
    places = basis.register_indices()
    assert np.allclose(out, sparse_matrix(ring).real.tocsr()[places][:, places] @ v, atol=1e-12)


def test_strings_of_varying_strength_are_not_constant_exchange():
    assert constant_exchange(sorted_strings(PauliList(terms="X0 X1 Z2 + Y0 Y1 Z2").hamiltonian(Chain(sites=3)))) is None
    assert constant_exchange(sorted_strings(PauliList(terms="X0 Y1 - Y0 X1").hamiltonian(Chain(sites=2)))) is None
    assert constant_exchange(sorted_strings(Ising().hamiltonian(Chain(sites=3)))) is None


@pytest.mark.parametrize(
    ("model", "lattice", "down"),
    [
        (Heisenberg(), Chain(sites=8), 4),
        (Heisenberg(), Chain(sites=8), 3),
        (XXZ(delta=0.4), Square(columns=4, rows=2), 4),
        (Ising(), Chain(sites=7), None),
    ],
    ids=["ring", "ring with S_z", "torus", "register"],
)
def test_orbit_blocks_are_invariant_subspaces_that_fill_the_sector(model, lattice, down):
    expansion = model.hamiltonian(lattice)
    matrix = sparse_matrix(expansion).toarray()
    basis, strings = basis_of(expansion.n_qubits, down), sorted_strings(expansion)
    places = basis.register_indices()
    sector = matrix[places][:, places]
    moves = lattice.build().translations
    group = symmetry_group(expansion, moves, with_inversion=down is None or 2 * down == basis.n_sites, real=True)
    tables = orbit_tables(basis, strings, group, 2**30, SILENT)
    filled, energies = 0, []
    for character in group.characters:
        block = OrbitBlock(tables, character, SILENT)
        columns = np.array([block.expand(unit) for unit in np.eye(block.dimension, dtype=block.dtype)]).T.reshape(basis.dimension, -1)
        assert np.allclose(columns.conj().T @ columns, np.eye(block.dimension), atol=1e-12)
        applied = np.empty_like(columns[: block.dimension])
        for j in range(block.dimension):
            out = np.empty(block.dimension, dtype=block.dtype)
            block.apply(np.eye(block.dimension, dtype=block.dtype)[j], out)
            applied[:, j] = out
        assert np.allclose(sector @ columns, columns @ applied, atol=1e-10)
        filled += character.pairs * block.dimension
        energies += list(np.linalg.eigvalsh(applied)) * character.pairs
    assert filled == basis.dimension
    assert np.allclose(np.sort(energies), np.linalg.eigvalsh(sector), atol=1e-9)


@pytest.mark.parametrize("terms", ["X0 X1 + 0.3 Z1 Z2 - Y0 Y2 + 0.7 X2", "X0 Y1 Z2 + X1", "Z0 Z1 Z2 Z3 - X3 - 0.2 Y0 Z1 + X1 X2"])
def test_the_halves_under_spin_inversion_hold_the_spectrum(terms):
    expansion = PauliList(terms=terms).hamiltonian(Chain(sites=4))
    matrix = sparse_matrix(expansion).toarray()
    energies = []
    for inversion in (1, -1):
        half = sparse_matrix(inverted_half(expansion, inversion)).toarray()
        energies += list(np.linalg.eigvalsh(half))
        block = RegisterBlock(basis_of(4, None), expansion, inversion, SILENT)
        v = RNG.normal(size=8) + (0.0 if block.dtype.kind == "f" else 1j)
        out = np.empty_like(v)
        block.apply(v, out)
        assert np.allclose(matrix @ block.expand(v), block.expand(out), atol=1e-12)
    assert np.allclose(np.sort(energies), np.linalg.eigvalsh(matrix), atol=1e-10)


def test_raising_a_state_is_the_sum_of_single_flips():
    n = 7
    for down in (1, 3, 4, 7):
        basis, above = basis_of(n, down), basis_of(n, down - 1)
        v, out = RNG.normal(size=basis.dimension), np.empty(above.dimension)
        kernels.raise_spin(v, out, 0, above.dimension, n, above.states, basis.bits, basis.offset, basis.rank)
        place = {int(s): i for i, s in enumerate(basis.states)}
        want = [sum(v[place[s | 1 << q]] for q in range(n) if not s >> q & 1) for s in above.states.tolist()]
        assert np.allclose(out, want)


def test_vector_sums_are_those_of_numpy():
    w, v, u = (RNG.normal(size=101) + 1j * RNG.normal(size=101) for _ in range(3))
    expected = w - (0.3 + 0.1j) * v
    assert lanczos.subtract(w, v, 0.3 + 0.1j) == pytest.approx(np.linalg.norm(expected) ** 2)
    assert np.allclose(w, expected)
    expected = w - 0.5 * v - 0.25 * u
    assert lanczos.subtract_two(w, v, 0.5, u, 0.25) == pytest.approx(np.linalg.norm(expected) ** 2)
    assert np.allclose(w, expected)


def test_sorted_strings_hold_every_term():
    expansion = PauliList(terms="X0 X1 + Y0 Y1 - Z0 + 2 + 0.5 X0 Z1 + X0").hamiltonian(Chain(sites=2))
    strings = sorted_strings(expansion)
    assert strings.x.tolist() == [1, 3]
    assert strings.pointer.tolist() == [0, 2, 4]
    assert sorted(strings.diagonal_values) == [-1.0, 2.0]
    assert collect_terms(2, expansion.x, expansion.z, expansion.coefficients).coefficients.size == 6
