"""Circuits that prepare a few basis states: the state by dense matrices, and what it costs."""

from __future__ import annotations

import math

import numpy as np
import pytest
from support.dense import gate_state

from thalweg.circuit.program import Gate, gate_program
from thalweg.circuit.sparse_state import preparation


def prepared(n, amplitudes):
    reference, gates = preparation(amplitudes)
    return gate_state(gate_program(n, reference, gates), np.zeros(0))


@pytest.mark.parametrize("seed", range(40))
def test_random_superpositions_come_out_up_to_their_sign(seed):
    rng = np.random.default_rng(seed)
    n = int(rng.integers(1, 7))
    bits = rng.choice(1 << n, rng.integers(1, min(16, 1 << n) + 1), replace=False)
    amplitudes = rng.normal(size=bits.size)
    amplitudes /= np.linalg.norm(amplitudes)
    expected = np.zeros(1 << n)
    expected[bits] = amplitudes
    state = prepared(n, dict(zip(bits.tolist(), amplitudes.tolist(), strict=True)))
    assert abs(np.vdot(expected, state)) == pytest.approx(1.0, abs=1e-12)
    assert np.abs(state.imag).max() < 1e-12


def test_one_basis_state_needs_no_gate():
    assert preparation({0b101: -1.0}) == (0b101, [])


def test_two_opposite_states_take_one_rotation_and_a_cnot_for_every_other_qubit():
    """The circuit of textbooks for (|0000> + |1111>) / sqrt 2."""
    _, gates = preparation({0: 2**-0.5, 0b1111: 2**-0.5})
    assert [gate[0] for gate in gates] == [Gate.ROTATION] + 3 * [Gate.CNOT]
    assert abs(gates[0][4]) == pytest.approx(math.pi / 2)


@pytest.mark.parametrize("count", [2, 4, 8, 16])
def test_the_cost_grows_with_terms_times_qubits(count):
    """Gleinig and Hoefler (DAC 2021): O(L n) CNOTs, at most about log2 L controls; here a control doubles the rotations."""
    n = 10
    bits = np.random.default_rng(count).choice(1 << n, count, replace=False).tolist()
    _, gates = preparation(dict.fromkeys(bits, count**-0.5))
    kinds = [gate[0] for gate in gates]
    assert kinds.count(Gate.CNOT) <= (count - 1) * (n - 1)
    assert kinds.count(Gate.ROTATION) <= (count - 1) * 2 ** math.ceil(math.log2(count))
