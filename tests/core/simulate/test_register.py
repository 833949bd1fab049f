"""The register engine against dense matrices, the shift rule, and the reference library for second quantisation."""

import numpy as np
import pytest
from support.dense import expansion_matrix, string_matrix

from thalweg import parts
from thalweg.ansatz.ground import Ground
from thalweg.ansatz.hardware_efficient import HardwareEfficient
from thalweg.circuit.program import Gate, GateProgram
from thalweg.errors import Stopped, StudyError
from thalweg.operators.pauli import PauliExpansion, collect_terms
from thalweg.simulate.register import RegisterEngine
from thalweg.watch import Watch


def gate_matrix(n, kind, x, z, angle):
    """Each gate by its textbook definition (Nielsen and Chuang, chapter 4)."""
    if kind == Gate.ROTATION:
        return np.cos(angle / 2) * np.eye(1 << n) - 1j * np.sin(angle / 2) * string_matrix(n, x, z)
    if kind == Gate.HADAMARD:
        return (string_matrix(n, x, 0) + string_matrix(n, 0, x)) / np.sqrt(2)
    identity, z_first = np.eye(1 << n), string_matrix(n, 0, x)
    flip = string_matrix(n, 0, z) if kind == Gate.CZ else string_matrix(n, z, 0)
    return (identity + z_first) / 2 + (identity - z_first) / 2 @ flip


def dense_state(program, parameters):
    state = np.zeros(1 << program.n_qubits, dtype=complex)
    state[program.reference] = 1
    rows = zip(program.kind.tolist(), program.x.tolist(), program.z.tolist(), program.parameter.tolist(), program.factor.tolist(), strict=True)
    for kind, x, z, k, factor in rows:
        state = gate_matrix(program.n_qubits, kind, x, z, factor if k < 0 else factor * parameters[k]) @ state
    return state


def random_expansion(rng, n, terms):
    x, z = (rng.integers(0, 1 << n, terms, dtype=np.uint64) for _ in range(2))
    return collect_terms(n, x, z, rng.normal(size=terms))


def random_program(rng, n, gates, n_parameters=5, *, real=False):
    """Every kind of gate; rotations of any weight, with shared, fixed and differently scaled angles."""
    kinds = [Gate.ROTATION] * 3 + [Gate.HADAMARD] + ([Gate.CZ, Gate.CNOT] if n > 1 else [])
    rows = []
    for _ in range(gates):
        kind = kinds[rng.integers(len(kinds))]
        if kind == Gate.ROTATION:
            style = rng.integers(5)
            x, z = (int(v) for v in rng.integers(0, 1 << n, 2))
            qubit = 1 << int(rng.integers(n))
            x, z = [(x, z), (qubit, qubit), (0, qubit), (0, z), (qubit, 0)][style]
            if real and (x & z).bit_count() % 2 == 0:
                x, z = qubit, qubit | z & ~qubit
            rows.append((kind, x, z, int(rng.integers(-1, n_parameters)), float(rng.normal())))
        elif kind == Gate.HADAMARD:
            rows.append((kind, 1 << int(rng.integers(n)), 0, -1, 0.0))
        else:
            a, b = rng.choice(n, 2, replace=False)
            rows.append((kind, 1 << int(a), 1 << int(b), -1, 0.0))
    kind, x, z, parameter, factor = zip(*rows, strict=True)
    return GateProgram(
        n,
        int(rng.integers(1 << n)),
        np.array(kind, np.uint8),
        np.array(x, np.uint64),
        np.array(z, np.uint64),
        np.array(parameter, np.int64),
        np.array(factor, float),
        n_parameters,
    )


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("n", [1, 2, 3, 4, 5, 6])
def test_states_and_energies_agree_with_dense_matrices(n, seed):
    rng = np.random.default_rng([n, seed])
    program, hamiltonian = random_program(rng, n, 40), random_expansion(rng, n, 30)
    parameters = rng.normal(size=program.n_parameters)
    engine = RegisterEngine(hamiltonian, program)
    expected = dense_state(program, parameters)
    state = engine.state(parameters)
    np.testing.assert_allclose(state, expected, atol=1e-12)
    assert np.linalg.norm(state) == pytest.approx(1.0, abs=1e-12)
    energy = np.vdot(expected, expansion_matrix(hamiltonian) @ expected).real
    assert engine.energy(parameters) == pytest.approx(energy, abs=1e-12)
    assert engine.energy_and_gradient(parameters)[0] == pytest.approx(energy, abs=1e-12)


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("real", [False, True])
@pytest.mark.parametrize("tile_bytes_bits", [7, 8, 9])
def test_tiles_smaller_than_the_register_change_nothing(tile_bytes_bits, real, seed):
    rng = np.random.default_rng([tile_bytes_bits, seed])
    n = 7
    program, hamiltonian = random_program(rng, n, 60, real=real), random_expansion(rng, n, 30)
    parameters = rng.normal(size=program.n_parameters)
    tiled, whole = (RegisterEngine(hamiltonian, program, tile_bytes_bits=bits) for bits in (tile_bytes_bits, 16))
    np.testing.assert_allclose(tiled.state(parameters), dense_state(program, parameters), atol=1e-12)
    (energy, gradient), (other_energy, other_gradient) = (engine.energy_and_gradient(parameters) for engine in (tiled, whole))
    assert energy == pytest.approx(other_energy, abs=1e-12)
    np.testing.assert_allclose(gradient, other_gradient, atol=1e-12)


@pytest.mark.parametrize("rotations", ["ry", "ry-rz"])
@pytest.mark.parametrize("entangler", ["ring", "all-pairs"])
def test_tables_of_diagonal_gates_follow_the_fixed_qubits_of_a_tile(entangler, rotations):
    rng = np.random.default_rng(9)
    n = 8
    hamiltonian = random_expansion(rng, n, 40)
    program = HardwareEfficient(depth=3, rotations=rotations, entangler=entangler).build(Ground(None, hamiltonian, 0b10110010))
    parameters = rng.normal(size=program.n_parameters)
    tiled, whole = (RegisterEngine(hamiltonian, program, tile_bytes_bits=bits) for bits in (7, 16))
    np.testing.assert_allclose(tiled.state(parameters), dense_state(program, parameters), atol=1e-12)
    np.testing.assert_allclose(tiled.energy_and_gradient(parameters)[1], whole.energy_and_gradient(parameters)[1], atol=1e-12)


@pytest.mark.parametrize("rotations", ["ry", "ry-rz"])
def test_threads_change_nothing(monkeypatch, rotations):
    monkeypatch.setattr(parts, "SHARED_FROM", 0)
    rng = np.random.default_rng(12)
    hamiltonian = random_expansion(rng, 9, 60)
    program = HardwareEfficient(depth=3, rotations=rotations, entangler="ring").build(Ground(None, hamiltonian, 5))
    parameters = rng.normal(size=program.n_parameters)
    serial, shared = (RegisterEngine(hamiltonian, program, tile_bytes_bits=8, threads=threads) for threads in (1, 3))
    np.testing.assert_array_equal(serial.state(parameters), shared.state(parameters))
    (energy, gradient), (other_energy, other_gradient) = (engine.energy_and_gradient(parameters) for engine in (serial, shared))
    assert shared.energy(parameters) == pytest.approx(energy, abs=1e-13) == other_energy
    np.testing.assert_allclose(gradient, other_gradient, atol=1e-13)
    np.testing.assert_array_equal(other_gradient, shared.energy_and_gradient(parameters)[1])


def test_the_norm_stays_one_through_a_deep_circuit():
    hamiltonian = random_expansion(np.random.default_rng(1), 9, 5)
    program = HardwareEfficient(depth=150, rotations="ry-rz", entangler="all-pairs").build(Ground(None, hamiltonian, 3))
    state = RegisterEngine(hamiltonian, program, tile_bytes_bits=10).state(np.random.default_rng(2).normal(size=program.n_parameters))
    assert np.linalg.norm(state) == pytest.approx(1.0, abs=1e-12)


@pytest.mark.parametrize("n", [1, 3, 6])
def test_gradient_agrees_with_central_differences(n):
    rng = np.random.default_rng(n)
    program = random_program(rng, n, 30)
    engine = RegisterEngine(random_expansion(rng, n, 30), program)
    parameters = rng.normal(size=program.n_parameters)
    gradient = engine.energy_and_gradient(parameters)[1]
    step = 1e-5
    for k, direction in enumerate(np.eye(program.n_parameters) * step):
        difference = (engine.energy(parameters + direction) - engine.energy(parameters - direction)) / (2 * step)
        assert gradient[k] == pytest.approx(difference, abs=1e-8)


def test_gradient_agrees_with_the_two_term_shift_rule():
    """dE/dtheta = (E(theta + pi/2) - E(theta - pi/2)) / 2 for exp(-i theta/2 P) (Mitarai et al. 2018; Schuld et al. 2019)."""
    rng = np.random.default_rng(11)
    n, gates = 5, 24
    x, z = (rng.integers(0, 1 << n, gates, dtype=np.uint64) for _ in range(2))
    program = GateProgram(n, 9, np.zeros(gates, np.uint8), x, z, np.arange(gates), np.ones(gates), gates)
    engine = RegisterEngine(random_expansion(rng, n, 25), program)
    parameters = rng.uniform(-np.pi, np.pi, gates)
    gradient = engine.energy_and_gradient(parameters)[1]
    for k, shift in enumerate(np.eye(gates) * np.pi / 2):
        assert gradient[k] == pytest.approx((engine.energy(parameters + shift) - engine.energy(parameters - shift)) / 2, abs=1e-12)


def test_facts_agree_with_dense_matrices():
    rng = np.random.default_rng(5)
    n = 4
    program = random_program(rng, n, 30)
    hamiltonian, number, s_z, s_squared = (random_expansion(rng, n, 12) for _ in range(4))
    engine = RegisterEngine(hamiltonian, program, number=number, s_z=s_z, s_squared=s_squared, label=lambda bits: f"<{bits}>")
    parameters = rng.normal(size=program.n_parameters)
    state, matrix = dense_state(program, parameters), expansion_matrix(hamiltonian)
    vectors = np.linalg.eigh(matrix)[1].T[:2]
    facts = engine.facts(parameters, vectors)
    for value, observable in ((facts.n_electrons, number), (facts.s_z, s_z), (facts.s_squared, s_squared)):
        assert value == pytest.approx(np.vdot(state, expansion_matrix(observable) @ state).real, abs=1e-12)
    mean = np.vdot(state, matrix @ state).real
    assert facts.variance == pytest.approx(np.vdot(state, matrix @ matrix @ state).real - mean**2, abs=1e-11)
    assert facts.fidelity == pytest.approx(sum(abs(np.vdot(v, state)) ** 2 for v in vectors), abs=1e-12)
    weights = np.abs(state) ** 2
    order = np.argsort(-weights)
    assert [entry.label for entry in facts.leading] == [f"<{bits}>" for bits in order[: len(facts.leading)]]
    assert facts.leading[0].weight == pytest.approx(weights[order[0]], abs=1e-12)
    assert facts.leading[0].exact_weight == pytest.approx(np.mean(np.abs(vectors[:, order[0]]) ** 2), abs=1e-12)


def test_facts_without_observables_and_exact_vectors_are_unknown():
    program = random_program(np.random.default_rng(2), 2, 5)
    facts = RegisterEngine(random_expansion(np.random.default_rng(3), 2, 5), program).facts(np.zeros(5), None)
    assert (facts.n_electrons, facts.s_z, facts.s_squared, facts.fidelity) == (None,) * 4
    assert facts.leading[0].exact_weight is None
    assert set(facts.leading[0].label) <= {"0", "1"}


def test_an_eigenstate_has_no_variance():
    z = PauliExpansion(3, np.zeros(3, np.uint64), np.array([1, 2, 4], np.uint64), np.array([1e3, 2e3, 3e3]))
    empty = np.empty(0, np.uint64)
    program = GateProgram(3, 5, np.empty(0, np.uint8), empty, empty, np.empty(0, np.int64), np.empty(0), 0)
    engine = RegisterEngine(z, program)
    assert engine.energy(np.empty(0)) == pytest.approx(-1e3 + 2e3 - 3e3)
    assert engine.facts(np.empty(0), None).variance == pytest.approx(0.0, abs=1e-18)


def test_a_register_past_the_budget_is_refused_with_the_figure():
    n = 40
    expansion = PauliExpansion(n, np.zeros(1, np.uint64), np.ones(1, np.uint64), np.ones(1))
    empty = np.empty(0, np.uint64)
    program = GateProgram(n, 0, np.empty(0, np.uint8), empty, empty, np.empty(0, np.int64), np.empty(0), 0)
    with pytest.raises(StudyError, match=r"40 qubits does not fit: it needs 3.28e\+04 GiB of memory and 4 GiB are allowed"):
        RegisterEngine(expansion, program)


@pytest.mark.parametrize(("rotations", "bytes_an_amplitude"), [("ry", 2 * 8 + 3 * 16), ("ry-rz", 2 * 16 + 16)])
def test_memory_is_estimated_from_the_size_of_the_register(rotations, bytes_an_amplitude):
    estimates = []
    for n in (24, 25):
        field = PauliExpansion(n, np.ones(1, np.uint64), np.ones(1, np.uint64), np.ones(1))  # Y: not real
        program = HardwareEfficient(depth=1, rotations=rotations).build(Ground(None, field, 0))
        estimates.append(RegisterEngine(field, program, budget_bytes=2**40).memory_bytes())
    assert estimates[1] - estimates[0] == pytest.approx(bytes_an_amplitude << 24, rel=0.01)
    assert estimates[0] < 24 * 2**30


def test_a_register_without_qubits_has_the_energy_of_the_identity():
    empty = np.empty(0, np.uint64)
    program = GateProgram(0, 0, np.empty(0, np.uint8), empty, empty, np.empty(0, np.int64), np.empty(0), 0)
    engine = RegisterEngine(PauliExpansion(0, np.zeros(1, np.uint64), np.zeros(1, np.uint64), np.array([-1.5])), program)
    assert engine.energy(np.empty(0)) == -1.5
    assert engine.energy_and_gradient(np.empty(0))[1].shape == (0,)
    assert engine.facts(np.empty(0), None).leading[0].weight == 1.0


def test_a_stop_ends_an_evaluation():
    rng = np.random.default_rng(8)
    engine = RegisterEngine(random_expansion(rng, 3, 5), random_program(rng, 3, 9), watch=Watch(should_stop=lambda: True))
    for evaluate in (engine.energy, engine.energy_and_gradient, engine.state):
        with pytest.raises(Stopped):
            evaluate(np.zeros(5))
