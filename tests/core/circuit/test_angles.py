"""A program with a parameter for every angle is the same circuit, and derivatives add up over shared parameters."""

import numpy as np
from support.dense import gate_state

from thalweg.circuit.angles import EXCITATION, IDENTITY, ROTATION, angles_of, one_parameter_an_angle
from thalweg.circuit.program import Excitation, ExcitationProgram, Gate, GateProgram
from thalweg.operators.fermion import Sector


def shared_program() -> GateProgram:
    """Two qubits: parameter 0 turns two gates, parameter 1 one; one gate has a fixed angle, one is a phase."""
    rows = [(1, 0, 0, 0.5), (0, 3, -1, 0.3), (3, 3, 1, -1.0), (0, 0, 1, 2.0), (2, 2, 0, 1.5)]
    x, z, parameter, factor = (np.array(column) for column in zip(*rows, strict=True))
    kind = np.full(len(rows), Gate.ROTATION, np.uint8)
    return GateProgram(2, 1, kind, x.astype(np.uint64), z.astype(np.uint64), parameter, factor.astype(float), 2)


def test_angles_are_parameters_times_factors_in_order_of_action():
    angles = angles_of(shared_program())
    assert angles.of(np.array([2.0, 3.0])).tolist() == [1.0, -3.0, 6.0, 3.0]
    assert angles.highest.tolist() == [ROTATION, ROTATION, IDENTITY, ROTATION]


def test_a_parameter_an_angle_gives_the_same_state():
    program, parameters = shared_program(), np.array([0.7, -1.1])
    separate = one_parameter_an_angle(program)
    assert separate.n_parameters == 4
    assert np.allclose(gate_state(separate, angles_of(program).of(parameters)), gate_state(program, parameters), atol=1e-15)


def test_derivatives_by_angle_add_up_with_their_factors():
    angles = angles_of(shared_program())
    assert angles.to_parameters(np.array([1.0, 10.0, 100.0, 1000.0])).tolist() == [0.5 + 1500.0, -10.0 + 200.0]


def test_excitations_have_two_frequencies_and_the_identity_none():
    excitations = (Excitation((0,), (1,)), Excitation((0,), (0,)), Excitation((0,), (1,), (0,), (1,)))
    program = ExcitationProgram(Sector(2, 1, 1), (1, 1), excitations, np.array([0, 1, 0]), np.array([1.0, 1.0, -0.5]), 2)
    angles = angles_of(program)
    assert angles.highest.tolist() == [EXCITATION, IDENTITY, EXCITATION]
    assert angles.widths.tolist() == [3.0, 0.0]
    assert one_parameter_an_angle(program).n_parameters == 3
