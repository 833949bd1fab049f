"""Encoded systems: counts, sectors, tapering, states and labels."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import openfermion
import pytest
from reference.hamiltonians import H2_ONE_QUBIT, PUBLISHED
from support.dense import annihilators, expansion_matrix, lowest_energy, sparse_matrix
from support.molecules import computed_molecule, random_hamiltonian, stored_molecule

from thalweg.encoding import ENCODINGS, BravyiKitaev, JordanWigner, ParityEncoding
from thalweg.encoding.encoded import DIAGONAL_NOTE, EncodedSystem, encode_fermions, encode_spins
from thalweg.encoding.linear import linear_encoding
from thalweg.encoding.occupations import determinant_masks
from thalweg.encoding.symmetry import taper_by
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.pauli import collect_terms, pauli_label

ALL = list(ENCODINGS)
BY_KEY = {"argvalues": ALL, "ids": [kind().key for kind in ALL]}


def terms(expansion) -> dict[str, float]:
    return dict(zip(expansion.labels(), expansion.coefficients.tolist(), strict=True))


def full_configuration_energy(hamiltonian: FermionHamiltonian) -> tuple[float, np.ndarray]:
    """PySCF FCI: energy and vector (Na, Nb)."""
    from pyscf import fci

    m, sector = hamiltonian.n_orbitals, hamiltonian.sector
    solver = fci.direct_spin1.FCI()
    solver.conv_tol = 1e-13
    energy, vector = solver.kernel(hamiltonian.one_body, hamiltonian.two_body, m, (sector.n_alpha, sector.n_beta), ecore=hamiltonian.core_energy)
    return float(energy), np.asarray(vector).reshape(sector.shape)


def state_energy(encoded: EncodedSystem, vector: np.ndarray) -> float:
    state = encoded.from_sector(vector[None])[0]
    return float(np.vdot(state, sparse_matrix(encoded.working) @ state).real)


@pytest.mark.parametrize("kind", **BY_KEY)
@pytest.mark.parametrize("name", list(PUBLISHED))
def test_counts_equal_the_published_ones(name, kind):
    encoded, published = encode_fermions(computed_molecule(name), kind(cut=1e-8)), PUBLISHED[name]
    assert (encoded.full.n_qubits, len(encoded.full)) == (published.qubits, published.terms)
    assert encoded.full.one_norm == pytest.approx(published.one_norm, abs=5e-4)
    assert encoded.working.n_qubits == published.tapered_qubits
    assert len(encoded.symmetries) == published.qubits - published.tapered_qubits


@pytest.mark.parametrize("kind", **BY_KEY)
def test_hydrogen_on_one_qubit_has_the_known_coefficients(kind):
    _, hamiltonian = stored_molecule("H2_sto-3g_singlet_0.7414")
    found = terms(encode_fermions(hamiltonian, kind()).working)
    assert found["I"] == pytest.approx(H2_ONE_QUBIT[0], abs=2e-6)
    assert abs(found["Z0"]) == pytest.approx(abs(H2_ONE_QUBIT[1]), abs=2e-6)
    assert abs(found["X0"]) == pytest.approx(H2_ONE_QUBIT[2], abs=2e-6)
    assert len(found) == 3


def test_removing_the_two_spin_parities_leaves_hydrogen_on_two_qubits():
    # the two-qubit reduction of Bravyi, Gambetta, Mezzacapo and Temme 2017: the identity and four strings
    data, hamiltonian = stored_molecule("H2_sto-3g_singlet_0.7414")
    linear = linear_encoding(ParityEncoding(), 4)
    plain = encode_fermions(hamiltonian, ParityEncoding(taper=False))
    two = taper_by(4, [linear.z_mask(0b0101), linear.z_mask(0b1010)], plain.reference_bits).expansion(plain.full)
    assert two is not None
    assert (two.n_qubits, len(two)) == (2, 5)
    assert np.linalg.eigvalsh(expansion_matrix(two))[0] == pytest.approx(data.fci_energy, abs=1e-8)


@pytest.mark.parametrize("name", ["H2_sto-3g_singlet_0.7414", "H2_6-31g_singlet_0.75", "H1-Li1_sto-3g_singlet_1.45"])
def test_encodings_and_tapering_agree_in_the_lowest_energy(name):
    data, hamiltonian = stored_molecule(name)
    found = [lowest_energy(encode_fermions(hamiltonian, kind()).working) for kind in ALL]
    found.append(lowest_energy(encode_fermions(hamiltonian, BravyiKitaev(taper=False)).full))
    assert max(found) - min(found) < 1e-10
    assert found[0] == pytest.approx(data.fci_energy, abs=5e-8)


def test_every_stored_molecule_gives_its_stored_exact_energy_in_every_encoding():
    # the 33 HDF5 files of the openfermion package; stored full configuration interaction energies, made with an older bohr
    names = [p.stem for p in (Path(openfermion.__file__).parent / "testing" / "data").glob("*_s*.hdf5")]
    assert len(names) == 33
    for name in names:
        data, hamiltonian = stored_molecule(name)
        for kind in ALL:
            assert lowest_energy(encode_fermions(hamiltonian, kind()).working) == pytest.approx(data.fci_energy, abs=5e-8)


@pytest.mark.parametrize("kind", **BY_KEY)
def test_water_keeps_the_lowest_state_of_its_sector(kind):
    hamiltonian = computed_molecule("H2O")
    energy, vector = full_configuration_energy(hamiltonian)
    encoded = encode_fermions(hamiltonian, kind())
    state = encoded.from_sector(vector[None])[0]
    assert encoded.weight_outside(vector[None])[0] < 1e-10
    assert np.linalg.norm(sparse_matrix(encoded.working) @ state - energy * state) < 1e-5
    assert state_energy(encoded, vector) == pytest.approx(energy, abs=1e-9)


@pytest.mark.parametrize("kind", **BY_KEY)
@pytest.mark.parametrize("taper", [False, True])
@pytest.mark.parametrize(("m", "n_alpha", "n_beta"), [(3, 2, 1), (4, 1, 3), (2, 1, 1), (3, 3, 1), (1, 1, 0)])
def test_sector_states_keep_energy_and_observables_on_the_register(kind, taper, m, n_alpha, n_beta):
    hamiltonian = random_hamiltonian(m, n_alpha, n_beta, 10 * m + n_alpha)
    energy, vector = full_configuration_energy(hamiltonian)
    encoded = encode_fermions(hamiltonian, kind(taper=taper))
    state = encoded.from_sector(vector[None])[0]
    assert np.linalg.norm(state) == pytest.approx(1, abs=1e-12)
    assert state_energy(encoded, vector) == pytest.approx(energy, abs=1e-9)
    residual = sparse_matrix(encoded.working) @ state - energy * state
    assert np.linalg.norm(residual) < 1e-5
    for operator, value in ((encoded.number, n_alpha + n_beta), (encoded.s_z, (n_alpha - n_beta) / 2)):
        assert operator is not None
        assert np.allclose(sparse_matrix(operator) @ state, value * state, atol=1e-12)
    from pyscf.fci import spin_op

    s_squared, _ = spin_op.spin_square(vector, m, (n_alpha, n_beta))
    assert encoded.s_squared is not None
    assert np.vdot(state, sparse_matrix(encoded.s_squared) @ state).real == pytest.approx(s_squared, abs=1e-9)


@pytest.mark.parametrize("kind", **BY_KEY)
def test_reference_bits_stand_for_the_reference_determinant(kind):
    hamiltonian = computed_molecule("LiH")
    for taper in (False, True):
        encoded = encode_fermions(hamiltonian, kind(taper=taper))
        diagonal = sparse_matrix(encoded.working).diagonal().real
        assert diagonal[encoded.reference_bits] == pytest.approx(hamiltonian.reference_energy, abs=1e-9)
        assert encoded.occupation_label(encoded.reference_bits) == "22 0000"


@pytest.mark.parametrize("kind", **BY_KEY)
def test_labels_tell_the_occupation_of_every_determinant(kind):
    hamiltonian = random_hamiltonian(3, 1, 2, 0)
    encoded = encode_fermions(hamiltonian, kind())
    alpha, beta = determinant_masks(hamiltonian.sector)
    for i, a in enumerate(alpha.tolist()):
        for j, b in enumerate(beta.tolist()):
            vector = np.zeros((1, *hamiltonian.sector.shape))
            vector[0, i, j] = 1
            (bits,) = np.flatnonzero(encoded.from_sector(vector)[0])
            text = "".join("0ab2"[(a >> p & 1) + 2 * (b >> p & 1)] for p in range(3))
            assert encoded.occupation_label(int(bits)) == f"{text[:2]} {text[2:]}"


def test_ground_state_of_another_symmetry_sector_is_seen_as_lost_weight():
    hamiltonian = computed_molecule("H2")
    wrong = replace(hamiltonian, reference=(0b01, 0b10))  # g and u: another irrep than the ground state
    encoded = encode_fermions(wrong, ParityEncoding())
    energy, vector = full_configuration_energy(hamiltonian)
    assert encoded.weight_outside(vector[None])[0] == pytest.approx(1, abs=1e-9)
    assert lowest_energy(encoded.working) > energy + 0.1
    assert encode_fermions(hamiltonian, ParityEncoding()).weight_outside(vector[None])[0] < 1e-12


def test_symmetries_are_told_in_words_with_sector_and_qubit():
    hamiltonian = replace(computed_molecule("H2O"), irrep_names=("A1", "A2", "B1", "B2"))
    encoded = encode_fermions(hamiltonian, JordanWigner())
    assert [s.label for s in encoded.symmetries] == [
        "parity of the alpha electrons",
        "parity of the beta electrons",
        "parity of the electrons in B2 orbitals",
        "parity of the electrons in B1 and B2 orbitals",
    ]
    assert [s.value for s in encoded.symmetries] == [-1, -1, 1, 1]
    assert len({s.removed for s in encoded.symmetries}) == 4


def test_every_symmetry_commutes_with_every_term_and_has_the_value_of_the_reference():
    for name in PUBLISHED:
        hamiltonian = computed_molecule(name)
        plain = encode_fermions(hamiltonian, BravyiKitaev(taper=False))
        for symmetry in encode_fermions(hamiltonian, BravyiKitaev()).symmetries:
            assert not np.any(np.bitwise_count(plain.full.x & np.uint64(symmetry.mask)) & 1)
            assert symmetry.value == (-1) ** (symmetry.mask & plain.reference_bits).bit_count()


def test_symmetries_found_without_a_point_group_have_the_same_words_in_every_encoding():
    _, hamiltonian = stored_molecule("H1-Li1_sto-3g_singlet_1.45")
    labels = {tuple(s.label for s in encode_fermions(hamiltonian, kind()).symmetries) for kind in ALL}
    assert labels == {
        (
            "parity of the alpha electrons",
            "parity of the beta electrons",
            "parity of the electrons in orbitals 3",
            "parity of the electrons in orbitals 4",
        )
    }


def test_one_qubit_is_kept_where_every_qubit_is_a_symmetry():
    hamiltonian = random_hamiltonian(1, 1, 1, 0)
    encoded = encode_fermions(hamiltonian, JordanWigner())
    assert (encoded.working.n_qubits, len(encoded.symmetries)) == (1, 1)
    assert expansion_matrix(encoded.working).diagonal()[encoded.reference_bits].real == pytest.approx(hamiltonian.reference_energy)


def test_spin_squared_is_given_up_where_it_leaves_the_sector():
    base = random_hamiltonian(2, 1, 1, 0)
    diagonal = np.einsum("pp->p", base.one_body)
    loose = replace(base, one_body=np.diag(diagonal), two_body=np.zeros((2,) * 4))
    encoded = encode_fermions(loose, JordanWigner())
    assert encoded.s_squared is None
    assert encoded.number is not None


def test_degenerate_orbitals_are_said_to_make_counts_depend_on_orientation():
    hamiltonian = random_hamiltonian(2, 1, 1, 0)
    assert encode_fermions(hamiltonian, JordanWigner()).degenerate_note == ""
    paired = replace(hamiltonian, orbital_energies=np.array([-0.5, -0.5]))
    assert "degenerate" in encode_fermions(paired, JordanWigner()).degenerate_note


def test_cut_is_recorded_and_drops_small_terms():
    hamiltonian = computed_molecule("LiH")
    coarse = encode_fermions(hamiltonian, JordanWigner(cut=1e-2))
    assert coarse.full.cut == coarse.working.cut == 1e-2
    assert np.abs(coarse.full.coefficients).min() > 1e-2
    assert len(coarse.full) < 631


def test_jordan_wigner_is_the_operator_on_the_occupation_basis():
    hamiltonian = random_hamiltonian(2, 1, 1, 8)
    a = annihilators(4)
    expected = hamiltonian.core_energy * np.eye(16)
    for p, q in np.ndindex(2, 2):
        for s in (0, 1):
            expected += hamiltonian.one_body[p, q] * a[2 * p + s].T @ a[2 * q + s]
            for r, t, other in np.ndindex(2, 2, 2):
                pair = a[2 * p + s].T @ a[2 * r + other].T @ a[2 * t + other] @ a[2 * q + s]
                expected += 0.5 * hamiltonian.two_body[p, q, r, t] * pair
    assert np.allclose(expansion_matrix(encode_fermions(hamiltonian, JordanWigner(taper=False)).full), expected, atol=1e-12)


def heisenberg_chain(n: int):
    x, z = [], []
    for i in range(n - 1):
        pair = 0b11 << i
        x += [pair, pair, 0]
        z += [0, pair, pair]
    return collect_terms(n, np.array(x, np.uint64), np.array(z, np.uint64), np.full(len(x), 0.25))


def test_spin_chain_loses_the_parity_qubit_and_keeps_its_sector():
    chain = heisenberg_chain(6)
    encoded = encode_spins(chain, JordanWigner(), 0b010101, may_taper=True)
    assert encoded.working.n_qubits == 5
    # Heisenberg open chain of six spins 1/2, S.S: exact diagonalisation, see e.g. Bonner and Fisher 1964
    assert lowest_energy(encoded.working) == pytest.approx(-2.4935771339, abs=1e-9)
    assert encoded.occupation_label(encoded.reference_bits) == "101010"
    values, vectors = np.linalg.eigh(expansion_matrix(chain))
    placed = encoded.from_register(vectors[:, :1].T)[0]
    assert np.linalg.norm(placed) == pytest.approx(1, abs=1e-12)
    assert np.allclose(sparse_matrix(encoded.working) @ placed, values[0] * placed, atol=1e-12)


def test_sites_stay_whole_unless_tapering_is_both_allowed_and_wanted():
    chain = heisenberg_chain(3)
    for settings, may_taper in ((JordanWigner(), False), (JordanWigner(taper=False), True)):
        encoded = encode_spins(chain, settings, 0b010, may_taper=may_taper)
        assert encoded.working is encoded.full is chain
        assert (encoded.reference_bits, encoded.symmetries, encoded.remarks) == (0b010, (), ())
        assert encoded.occupation_label(0b011) == "110"


def test_strings_with_an_odd_number_of_y_keep_their_spectrum_under_tapering():
    # X0 Y1 - Y0 X1 commutes with Z0 Z1
    pairs = collect_terms(3, np.array([3, 3, 6], np.uint64), np.array([2, 1, 6], np.uint64), np.array([0.7, -0.7, 0.4]))
    spectrum = np.linalg.eigvalsh(expansion_matrix(pairs))
    found = [np.linalg.eigvalsh(expansion_matrix(encode_spins(pairs, JordanWigner(), bits, may_taper=True).working)) for bits in (0b000, 0b001)]
    assert np.allclose(np.sort(np.concatenate(found)), spectrum, atol=1e-12)


def test_diagonal_spin_hamiltonian_is_left_whole_and_says_so():
    ising = collect_terms(3, np.zeros(2, np.uint64), np.array([3, 6], np.uint64), np.array([1.0, 1.0]))
    encoded = encode_spins(ising, JordanWigner(), 0b010, may_taper=True)
    assert encoded.working is encoded.full
    assert encoded.remarks == (DIAGONAL_NOTE,)
    assert encode_spins(ising, JordanWigner(taper=False), 0b010, may_taper=True).remarks == ()


def test_label_of_a_string_names_its_letters():
    assert [pauli_label(*masks) for masks in ((0, 0), (1, 2), (4, 4))] == ["I", "X0 Z1", "Y2"]
