"""Gates from excitations against the exponentials of the fermionic generators."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.linalg import expm
from support.dense import excitation_matrix, gate_state
from support.molecules import computed_molecule, random_hamiltonian

from thalweg.circuit import Excitation, ExcitationProgram
from thalweg.circuit.compile import FULL_REGISTER, excitation_gates, leaves_sector
from thalweg.encoding import ENCODINGS
from thalweg.encoding.encoded import encode_fermions
from thalweg.encoding.occupations import determinant_masks, interleave, order_signs
from thalweg.operators.fermion import FermionHamiltonian, WeightedDeterminant

ALL = list(ENCODINGS)


def program_of(hamiltonian: FermionHamiltonian, excitations: list[Excitation]) -> ExcitationProgram:
    count = len(excitations)
    factor = np.linspace(1.0, -0.5, count)
    return ExcitationProgram(hamiltonian.sector, hamiltonian.reference, tuple(excitations), np.arange(count)[::-1].copy(), factor, count, "as listed")


def sector_state(program: ExcitationProgram, parameters: np.ndarray) -> np.ndarray:
    """The state by matrix exponentials on the occupation basis, then as (Na, Nb) amplitudes."""
    sector = program.sector
    n = 2 * sector.n_orbitals
    alpha, beta = determinant_masks(sector)
    index = (interleave(alpha)[:, None] | interleave(beta)[None, :] << np.uint64(1)).astype(int)
    signs = order_signs(alpha, beta)
    start = np.zeros(sector.shape)
    for amplitude, *masks in program.begins:
        start[np.searchsorted(alpha, masks[0]), np.searchsorted(beta, masks[1])] = amplitude
    state = np.zeros(1 << n)
    state[index] = start * signs
    for excitation, k, factor in zip(program.excitations, program.parameter, program.factor, strict=True):
        state = expm(factor * parameters[k] * excitation_matrix(excitation, n)) @ state
    return state[index] * signs


def close_up_to_phase(left: np.ndarray, right: np.ndarray) -> bool:
    return abs(abs(np.vdot(left, right)) - np.linalg.norm(right) ** 2) < 1e-12 and abs(np.linalg.norm(left) - np.linalg.norm(right)) < 1e-12


MIXED = [
    Excitation((0,), (2,), (1,), (3,)),
    Excitation((0, 1), (2, 3)),
    Excitation(beta_source=(0, 1), beta_target=(2, 3)),
    Excitation((1,), (2,)),
    Excitation(beta_source=(0,), beta_target=(3,)),
    Excitation((0,), (3,), (0,), (2,)),
]


@pytest.mark.parametrize("kind", ALL, ids=lambda k: k().key)
@pytest.mark.parametrize("taper", [False, True])
def test_gates_give_the_state_of_the_excitations(kind, taper):
    hamiltonian = random_hamiltonian(4, 2, 2, 1)
    encoded = encode_fermions(hamiltonian, kind(taper=taper))
    assert encoded.working.n_qubits == (6 if taper else 8)
    program = program_of(hamiltonian, MIXED)
    parameters = np.random.default_rng(2).normal(size=program.n_parameters)
    gates = excitation_gates(program, encoded)
    assert gates.n_qubits == encoded.working.n_qubits
    expected = encoded.from_sector(sector_state(program, parameters)[None])[0]
    assert abs(np.linalg.norm(expected) - 1) < 1e-12
    assert np.allclose(gate_state(gates, parameters), sign_of(encoded) * expected, atol=1e-12)


def sign_of(encoded) -> float:
    """The reference determinant as a sector state may carry a sign against the register's basis state."""
    alpha, beta = (np.array([mask], np.uint64) for mask in (0b11, 0b11))
    return float(order_signs(alpha, beta)[0, 0])


@pytest.mark.parametrize("kind", ALL, ids=lambda k: k().key)
def test_point_group_symmetry_merges_strings_and_keeps_the_state(kind):
    hamiltonian = computed_molecule("H2")
    encoded = encode_fermions(hamiltonian, kind())
    program = program_of(hamiltonian, [Excitation((0,), (1,), (0,), (1,))])
    gates = excitation_gates(program, encoded)
    assert (gates.n_qubits, gates.kind.size) == (1, 1)
    expected = encoded.from_sector(sector_state(program, np.array([0.3]))[None])[0]
    assert close_up_to_phase(gate_state(gates, np.array([0.3])), expected)


def test_excitation_that_breaks_a_removed_symmetry_goes_to_the_full_register():
    hamiltonian = computed_molecule("H2")
    encoded = encode_fermions(hamiltonian, ALL[0]())
    program = program_of(hamiltonian, [Excitation((0,), (1,)), Excitation((0,), (1,), (0,), (1,))])
    gates = excitation_gates(program, encoded)
    assert gates.n_qubits == 4
    assert FULL_REGISTER in gates.order
    whole = encode_fermions(hamiltonian, ALL[0](taper=False))
    parameters = np.array([0.2, -0.4])
    expected = whole.from_sector(sector_state(program, parameters)[None])[0]
    assert close_up_to_phase(gate_state(gates, parameters), expected)


def test_open_shell_reference_and_empty_programs():
    hamiltonian = random_hamiltonian(3, 2, 0, 4)
    encoded = encode_fermions(hamiltonian, ALL[2]())
    program = program_of(hamiltonian, [Excitation((1,), (2,)), Excitation((0,), (2,))])
    parameters = np.array([0.7, 0.1])
    expected = encoded.from_sector(sector_state(program, parameters)[None])[0]
    assert close_up_to_phase(gate_state(excitation_gates(program, encoded), parameters), expected)
    nothing = excitation_gates(replace(program, excitations=(), parameter=np.empty(0, np.int64), factor=np.empty(0), n_parameters=0), encoded)
    assert nothing.kind.size == 0
    assert nothing.reference == encoded.reference_bits


TERMS = ((0.7, 0b0011, 0b0011), (-0.5, 0b0101, 0b0101), (0.4, 0b1001, 0b0110), (0.1**0.5, 0b1100, 0b1100))


@pytest.mark.parametrize("kind", ALL, ids=lambda k: k().key)
@pytest.mark.parametrize("taper", [False, True])
def test_gates_prepare_a_combination_of_determinants_first(kind, taper):
    hamiltonian = random_hamiltonian(4, 2, 2, 1)
    encoded = encode_fermions(hamiltonian, kind(taper=taper))
    program = replace(program_of(hamiltonian, MIXED), reference_terms=tuple(WeightedDeterminant(*term) for term in TERMS))
    parameters = np.random.default_rng(2).normal(size=program.n_parameters)
    gates = excitation_gates(program, encoded)
    assert gates.n_qubits == encoded.working.n_qubits
    expected = encoded.from_sector(sector_state(program, parameters)[None])[0]
    assert close_up_to_phase(gate_state(gates, parameters), expected)


def test_a_reference_that_mixes_a_removed_symmetry_goes_to_the_full_register():
    hamiltonian = computed_molecule("H2")
    encoded = encode_fermions(hamiltonian, ALL[0]())
    terms = (WeightedDeterminant(0.8, 1, 1), WeightedDeterminant(0.6, 1, 2))
    program = replace(program_of(hamiltonian, [Excitation((0,), (1,), (0,), (1,))]), reference_terms=terms)
    assert leaves_sector(program, encoded)
    gates = excitation_gates(program, encoded)
    assert gates.n_qubits == 4
    assert FULL_REGISTER in gates.order
    whole = encode_fermions(hamiltonian, ALL[0](taper=False))
    assert not leaves_sector(program, whole)
    expected = whole.from_sector(sector_state(program, np.array([0.4]))[None])[0]
    assert close_up_to_phase(gate_state(gates, np.array([0.4])), expected)
