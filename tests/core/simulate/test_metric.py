"""The metric tensor of circuits whose metric is known, and of any circuit by finite differences."""

from dataclasses import replace

import numpy as np
import pytest
from support.dense import gate_state
from support.hamiltonians import random_molecule

from thalweg.ansatz import UCCSD, Ground, HardwareEfficient, KUpCCGSD
from thalweg.circuit.program import Gate, GateProgram
from thalweg.errors import StudyError
from thalweg.operators.fermion import WeightedDeterminant
from thalweg.operators.pauli import PauliExpansion
from thalweg.simulate.metric import metric_tensor
from thalweg.simulate.register import RegisterEngine
from thalweg.simulate.sector import SectorEngine

BUDGET = 2**28


def program_of(n, rows):
    """Rows kind, x, z, parameter, factor."""
    kind, x, z, parameter, factor = zip(*rows, strict=True)
    masks = np.array(x, np.uint64), np.array(z, np.uint64)
    return GateProgram(n, 0, np.array(kind, np.uint8), *masks, np.array(parameter, np.int64), np.array(factor, float), max(parameter) + 1)


def by_differences(state, x, h=1e-5):
    """g_ij = Re <d_i|d_j> - <d_i|psi><psi|d_j> with central differences of the state."""
    psi = state(x).ravel()
    slopes = np.array([(state(x + h * e).ravel() - state(x - h * e).ravel()) / (2 * h) for e in np.eye(x.size)])
    overlaps = slopes.conj() @ psi
    return (slopes.conj() @ slopes.T - np.outer(overlaps, overlaps.conj())).real


def test_a_layer_of_ry_has_a_quarter_of_the_identity():
    """Stokes et al., Quantum 4, 269 (2020): variances of Y/2 in |0..0>."""
    program = program_of(3, [(Gate.ROTATION, 1 << q, 1 << q, q, 1.0) for q in range(3)])
    assert np.allclose(metric_tensor(program, np.array([0.3, 1.1, -2.0]), budget_bytes=BUDGET), np.eye(3) / 4, atol=1e-15)


@pytest.mark.parametrize("theta", [0.0, 0.4, 2.2])
def test_rz_after_ry_has_sine_squared_over_four(theta):
    """Stokes et al., Quantum 4, 269 (2020): the sphere in its own coordinates."""
    program = program_of(1, [(Gate.ROTATION, 1, 1, 0, 1.0), (Gate.ROTATION, 0, 1, 1, 1.0)])
    expected = np.diag([0.25, np.sin(theta) ** 2 / 4])
    assert np.allclose(metric_tensor(program, np.array([theta, 0.7]), budget_bytes=BUDGET), expected, atol=1e-15)


def test_gates_of_every_kind_agree_with_differences_of_the_state():
    rows = [
        (Gate.HADAMARD, 4, 0, -1, 0.0),
        (Gate.ROTATION, 1, 1, 2, 1.0),
        (Gate.CNOT, 1, 2, -1, 0.0),
        (Gate.ROTATION, 3, 6, 0, 0.5),
        (Gate.ROTATION, 0, 5, 1, -1.3),
        (Gate.CZ, 2, 4, -1, 0.0),
        (Gate.ROTATION, 2, 0, -1, 0.9),
        (Gate.ROTATION, 7, 7, 2, 2.0),
        (Gate.ROTATION, 4, 4, 3, 1.0),
    ]
    program = program_of(3, rows)
    nothing = PauliExpansion(3, np.zeros(1, np.uint64), np.zeros(1, np.uint64), np.ones(1))
    engine = RegisterEngine(nothing, program)
    x = np.array([0.3, -0.9, 1.4, 0.2])
    assert np.allclose(metric_tensor(program, x, budget_bytes=BUDGET), by_differences(engine.state, x), atol=1e-9)


def test_layered_circuits_agree_with_differences_of_dense_states():
    ground = Ground(None, PauliExpansion(3, np.zeros(1, np.uint64), np.ones(1, np.uint64), np.ones(1)), 0b101)
    program = HardwareEfficient(depth=1, rotations="ry-rz").build(ground)
    bare = program.kind == Gate.ROTATION  # the dense helper knows rotations alone
    program = GateProgram(
        3, 5, program.kind[bare], program.x[bare], program.z[bare], program.parameter[bare], program.factor[bare], program.n_parameters
    )
    x = np.random.default_rng(2).normal(size=program.n_parameters)
    assert np.allclose(metric_tensor(program, x, budget_bytes=BUDGET), by_differences(lambda p: gate_state(program, p), x), atol=1e-9)


@pytest.mark.parametrize("ansatz", [UCCSD(spin_tied=True), KUpCCGSD(k=2)], ids=["uccsd-tied", "k-upccgsd"])
def test_excitations_agree_with_differences_of_the_state(ansatz):
    hamiltonian = random_molecule(4, 2, 1)
    program = ansatz.build(Ground(hamiltonian, None, 0))
    engine = SectorEngine(hamiltonian, program)
    x = np.random.default_rng(3).normal(scale=0.5, size=program.n_parameters)
    assert np.allclose(metric_tensor(program, x, budget_bytes=BUDGET), by_differences(engine.state, x), atol=1e-8)


def test_the_metric_is_refused_past_the_budget():
    program = program_of(10, [(Gate.ROTATION, 1 << q, 1 << q, q, 1.0) for q in range(10)])
    with pytest.raises(StudyError, match="metric tensor does not fit"):
        metric_tensor(program, np.zeros(10), budget_bytes=2**16)


def test_a_combination_as_reference_agrees_with_differences_of_the_state():
    h = random_molecule(4, 2, 2)
    terms = (WeightedDeterminant(0.8, 0b0011, 0b0011), WeightedDeterminant(-0.6, 0b0101, 0b0101))
    program = UCCSD().build(Ground(replace(h, reference_terms=terms), None, 0))
    x = np.random.default_rng(5).normal(0.0, 0.4, program.n_parameters)
    metric = metric_tensor(program, x, budget_bytes=BUDGET)
    assert np.allclose(metric, by_differences(SectorEngine(h, program).state, x), atol=1e-8)
