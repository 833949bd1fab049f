"""The linear encodings against the openfermion library, and what they must satisfy on their own."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from support.dense import expansion_matrix
from support.molecules import random_hamiltonian, stored_molecule

from thalweg.encoding import ENCODINGS, BravyiKitaev, JordanWigner, ParityEncoding
from thalweg.encoding.interchange import to_fermion_operator, to_qubit_operator
from thalweg.encoding.linear import linear_encoding, map_hamiltonian, number_operator, s_squared_operator, s_z_operator
from thalweg.errors import StudyError
from thalweg.operators.fermion import Sector

ALL = [kind() for kind in ENCODINGS]


def oracle(key: str, operator, n: int):
    """The same encoding by openfermion."""
    import openfermion as of

    if key == "jordan-wigner":
        return of.jordan_wigner(operator)
    if key == "bravyi-kitaev":
        return of.bravyi_kitaev(operator, n)
    return of.binary_code_transform(operator, of.parity_code(n))


def largest_difference(left, right) -> float:
    return max((abs(c) for c in (left - right).terms.values()), default=0.0)


@pytest.mark.parametrize("encoding", ALL, ids=lambda e: e.key)
@pytest.mark.parametrize("name", ["H2_sto-3g_singlet_0.7414", "H1-Li1_sto-3g_singlet_1.45", "H2_6-31g_singlet_0.75"])
def test_molecule_maps_as_openfermion_maps_it(name, encoding):
    _, hamiltonian = stored_molecule(name)
    n = 2 * hamiltonian.n_orbitals
    expected = oracle(encoding.key, to_fermion_operator(hamiltonian), n)
    mine = to_qubit_operator(map_hamiltonian(hamiltonian, linear_encoding(encoding, n)))
    assert largest_difference(mine, expected) < 1e-12


@settings(max_examples=25, deadline=None)
@given(st.integers(1, 4), st.integers(0, 2**16), st.sampled_from(ALL))
def test_random_hamiltonian_maps_as_openfermion_maps_it(m, seed, encoding):
    hamiltonian = random_hamiltonian(m, 1, 0, seed)
    operator = to_fermion_operator(hamiltonian)
    if encoding.key == "parity" and m == 1:
        # openfermion's parity code is not defined on two modes: compare matrices instead
        import openfermion as of

        mine = np.linalg.eigvalsh(expansion_matrix(map_hamiltonian(hamiltonian, linear_encoding(encoding, 2))))
        assert np.allclose(mine, np.linalg.eigvalsh(of.get_sparse_operator(operator, 2).toarray()), atol=1e-12)
        return
    mine = to_qubit_operator(map_hamiltonian(hamiltonian, linear_encoding(encoding, 2 * m)))
    assert largest_difference(mine, oracle(encoding.key, operator, 2 * m)) < 1e-12


@pytest.mark.parametrize("encoding", ALL, ids=lambda e: e.key)
@pytest.mark.parametrize("n", [1, 2, 5, 8, 13, 62])
def test_masks_invert_each_other(encoding, n):
    linear = linear_encoding(encoding, n)
    occupations = np.random.default_rng(n).integers(0, 1 << n, size=50, dtype=np.uint64)
    assert np.array_equal(linear.decode(linear.encode(occupations)), occupations)
    for modes in occupations[:5].tolist():
        assert linear.modes_of(linear.z_mask(modes)) == modes


@pytest.mark.parametrize("n", [3, 6, 7, 8, 12, 13])
def test_bravyi_kitaev_sums_are_those_of_the_binary_indexed_tree(n):
    from openfermion.transforms.opconversions.bravyi_kitaev import _occupation_set, _parity_set, _update_set

    linear = linear_encoding(BravyiKitaev(), n)
    for p in range(n):
        assert {q for q in range(n) if int(linear.update[p]) >> q & 1} == _update_set(p, n) | {p}
        assert {q for q in range(n) if int(linear.flip[p]) >> q & 1} == _occupation_set(p)
        assert {q for q in range(n) if int(linear.parity[p]) >> q & 1} == _parity_set(p)


@pytest.mark.parametrize("encoding", ALL, ids=lambda e: e.key)
@pytest.mark.parametrize("m", [1, 2, 3])
def test_observables_equal_those_of_openfermion(encoding, m):
    import openfermion as of

    linear = linear_encoding(encoding, 2 * m)
    states = np.arange(1 << 2 * m, dtype=np.uint64)
    order = linear.encode(states).astype(int)  # row of the register that holds each occupation
    for mine, operator in (
        (number_operator(linear), of.number_operator(2 * m)),
        (s_z_operator(linear), of.sz_operator(m)),
        (s_squared_operator(linear), of.s_squared_operator(m)),
    ):
        matrix = expansion_matrix(mine)[np.ix_(order, order)]
        plain = of.get_sparse_operator(operator, 2 * m).toarray()
        reverse = [int(f"{s:0{2 * m}b}"[::-1], 2) for s in range(1 << 2 * m)]  # openfermion: qubit 0 most significant
        assert np.allclose(matrix, plain[np.ix_(reverse, reverse)], atol=1e-13)


def test_every_string_is_written_once_and_in_order():
    hamiltonian = random_hamiltonian(7, 2, 2, 3)
    expansion = map_hamiltonian(hamiltonian, linear_encoding(ParityEncoding(), 14))
    pairs = set(zip(expansion.x.tolist(), expansion.z.tolist(), strict=True))
    assert len(pairs) == len(expansion)
    assert list(zip(expansion.x.tolist(), expansion.z.tolist(), strict=True)) == sorted(pairs)


def test_more_than_62_spin_orbitals_are_refused_with_a_sentence():
    with pytest.raises(StudyError, match="at most 62 qubits"):
        linear_encoding(JordanWigner(), 64)


def test_sixty_two_qubits_keep_the_reference_energy():
    m = 31
    hamiltonian = random_hamiltonian(2, 1, 1, 5)
    one_body, two_body = np.zeros((m, m)), np.zeros((m,) * 4)
    far = np.ix_([3, 30], [3, 30])
    one_body[far] = hamiltonian.one_body
    two_body[np.ix_(*[[3, 30]] * 4)] = hamiltonian.two_body
    small = to_qubit_operator(map_hamiltonian(hamiltonian, linear_encoding(JordanWigner(), 4)))
    wide = replace(hamiltonian, one_body=one_body, two_body=two_body, sector=Sector(m, 1, 1), orbital_irreps=np.zeros(m, np.int64))
    large = map_hamiltonian(wide, linear_encoding(JordanWigner(), 62))
    assert len(large) == len(small.terms)
    assert large.one_norm == pytest.approx(sum(abs(c) for t, c in small.terms.items() if t), abs=1e-12)
