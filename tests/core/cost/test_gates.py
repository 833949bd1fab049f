"""Gate counts against circuits counted by hand and written out independently."""

from __future__ import annotations

import numpy as np
import pytest

from thalweg.circuit import Gate, GateProgram
from thalweg.cost.gates import gate_counts


def rotations(n: int, strings: list[tuple[int, int]], reference: int = 0, kind: int = Gate.ROTATION) -> GateProgram:
    count = len(strings)
    x, z = (np.array([s[i] for s in strings], np.uint64) for i in (0, 1))
    return GateProgram(n, reference, np.full(count, kind, np.uint8), x, z, np.zeros(count, np.int64), np.ones(count), 1)


@pytest.mark.parametrize("weight", [2, 3, 6])
def test_ladder_takes_two_cnot_less_two_for_each_qubit(weight):
    # common practice: 2 (w - 1) CNOT around one RZ
    counts = gate_counts(rotations(8, [(0, (1 << weight) - 1)]))
    assert (counts.two_qubit, counts.single_qubit, counts.rotations) == (2 * (weight - 1), 1, 1)
    assert counts.depth == 2 * (weight - 1) + 1
    assert counts.two_qubit_depth == 2 * (weight - 1)


def test_basis_changes_stand_on_both_sides_of_x_and_y():
    # X0 Y1 Z2: two qubits turned before and after
    counts = gate_counts(rotations(3, [(0b011, 0b110)]))
    assert counts.single_qubit == 5
    assert counts.two_qubit == 4


def test_gates_on_different_qubits_run_at_once():
    counts = gate_counts(rotations(4, [(0, 0b0011), (0, 0b1100)]))
    assert counts.depth == 3
    assert gate_counts(rotations(4, [(0, 0b0011), (0, 0b0110)])).depth == 6


def test_one_qubit_rotations_identity_and_reference():
    counts = gate_counts(rotations(2, [(1, 0), (2, 2), (0, 0)], reference=0b11))
    assert (counts.rotations, counts.single_qubit, counts.two_qubit, counts.depth) == (2, 4, 0, 2)


def test_fixed_gates_are_counted():
    assert gate_counts(rotations(3, [(1, 2), (2, 4)], kind=Gate.CZ)).two_qubit == 2
    assert gate_counts(rotations(3, [(1, 2), (4, 2)], kind=Gate.CNOT)).depth == 2
    assert gate_counts(rotations(3, [(1, 0), (2, 0)], kind=Gate.HADAMARD)).single_qubit == 2


def test_double_excitation_without_overlap_of_strings_takes_48_cnot():
    # Romero et al. 2018: a double excitation has 8 strings; on four neighbouring qubits each has weight 4
    from support.molecules import random_hamiltonian

    from thalweg.circuit import Excitation, ExcitationProgram
    from thalweg.circuit.compile import excitation_gates
    from thalweg.encoding import JordanWigner
    from thalweg.encoding.encoded import encode_fermions

    hamiltonian = random_hamiltonian(2, 1, 1, 0)
    program = ExcitationProgram(hamiltonian.sector, (1, 1), (Excitation((0,), (1,), (0,), (1,)),), np.zeros(1, np.int64), np.ones(1), 1)
    counts = gate_counts(excitation_gates(program, encode_fermions(hamiltonian, JordanWigner(taper=False))))
    assert (counts.rotations, counts.two_qubit) == (8, 48)
    assert counts.convention.startswith("A rotation")
