"""What is said of E(theta) without evaluating it: the right sums of sines, a true bound, gates that really are the same."""

import numpy as np
import pytest
from support.dense import expansion_matrix, gate_state

from thalweg.ansatz import Ground, HardwareEfficient
from thalweg.circuit.axes import with_free_axes
from thalweg.circuit.program import Excitation, ExcitationProgram, Gate, GateProgram
from thalweg.circuit.structure import structure_of
from thalweg.operators.fermion import Sector
from thalweg.operators.pauli import PauliExpansion, collect_terms


def rotations(n: int, rows: list[tuple[int, int, int, float]], n_parameters: int) -> GateProgram:
    """Rotations given as x, z, parameter, factor."""
    x, z, parameter, factor = (np.array(column) for column in zip(*rows, strict=True))
    kind = np.full(len(rows), Gate.ROTATION, np.uint8)
    return GateProgram(n, 0, kind, x.astype(np.uint64), z.astype(np.uint64), parameter.astype(np.int64), factor.astype(float), n_parameters)


def random_expansion(n: int, count: int, seed: int) -> PauliExpansion:
    rng = np.random.default_rng(seed)
    masks = rng.integers(0, 1 << n, (2, count)).astype(np.uint64)
    return collect_terms(n, masks[0], masks[1], rng.normal(size=count))


def energy_of(program: GateProgram, expansion: PauliExpansion):
    matrix = expansion_matrix(expansion)

    def energy(parameters: np.ndarray) -> float:
        state = gate_state(program, parameters)
        return float(np.vdot(state, matrix @ state).real)

    return energy


MIXED = rotations(3, [(1, 1, 0, 1.0), (2, 3, 1, 0.5), (7, 0, 1, -1.5), (0, 5, 2, 1.0), (4, 4, 2, 2.0), (3, 1, 3, 0.7)], 4)


def test_degrees_follow_from_the_factors_of_each_parameter():
    structure = structure_of(MIXED, 1.0)
    assert structure.degree.tolist() == [1, 4, 3, 1]
    assert structure.base.tolist() == [1.0, 0.5, 1.0, 0.7]


def test_the_energy_along_a_parameter_is_the_sum_of_sines_that_the_structure_names():
    structure, energy = structure_of(MIXED, 1.0), energy_of(MIXED, random_expansion(3, 12, 5))
    here = np.array([0.3, -0.8, 1.2, 0.5])
    for k, (base, degree) in enumerate(zip(structure.base, structure.degree, strict=True)):
        places = 2 * np.pi * np.arange(2 * degree + 1) / (2 * degree + 1)
        values = [energy(here + np.eye(4)[k] * place / base) for place in places]
        spectrum, orders = np.fft.fft(values) / len(values), np.arange(-degree, degree + 1)
        for u in (0.4, 2.9):
            predicted = (spectrum[orders] * np.exp(1j * u * orders)).sum().real
            assert predicted == pytest.approx(energy(here + np.eye(4)[k] * u / base), abs=1e-12)


def test_angles_without_a_common_divisor_have_no_short_sum():
    program = rotations(1, [(1, 0, 0, 1.0), (1, 1, 0, 3**0.5)], 1)
    assert structure_of(program, 1.0).degree.tolist() == [-1]
    assert not structure_of(program, 1.0).has_harmonics


def test_second_derivatives_stay_below_the_bound_and_come_near_it():
    expansion = PauliExpansion(1, np.array([0, 1], np.uint64), np.array([1, 0], np.uint64), np.array([0.6, 0.8]))
    program = rotations(1, [(1, 1, 0, 2.0)], 1)
    energy, bound, h = energy_of(program, expansion), structure_of(program, expansion.one_norm).steepness, 1e-3
    curvature = [abs(energy(np.array([t + h])) - 2 * energy(np.array([t])) + energy(np.array([t - h]))) / h**2 for t in np.linspace(0, 3, 40)]
    assert bound == pytest.approx(4 * 1.4)
    assert 0.6 * bound < max(curvature) <= bound


def test_commuting_neighbours_share_a_layer():
    ground = Ground(None, random_expansion(3, 5, 1), 0)
    program = HardwareEfficient(depth=2, rotations="ry-rz").build(ground)
    assert structure_of(program, 1.0).layer.tolist() == [n for n in range(6) for _ in range(3)]
    excitations = (Excitation((0,), (1,)), Excitation((), (), (0,), (1,)), Excitation((1,), (2,)))
    chain = ExcitationProgram(Sector(3, 1, 1), (1, 1), excitations, np.arange(3), np.ones(3), 3)
    assert structure_of(chain, 1.0).layer.tolist() == [0, 0, 1]


def test_gates_with_free_axes_hold_every_single_qubit_rotation():
    """RX, RY and RZ are R_z R_y R_z at known angles; the two-qubit rotation and the shared parameter stay."""
    program = rotations(2, [(1, 0, 0, 1.0), (2, 2, 1, 1.0), (3, 3, 2, 0.5), (0, 1, 3, 1.0), (2, 0, 4, 1.0), (1, 0, 4, 1.0)], 5)
    free = with_free_axes(program)
    assert free.n_parameters == 3 * 3 + 2
    triples = structure_of(free, 1.0).triples
    assert len(triples) == 3
    x, y, middle, z, shared = 0.4, -0.7, 1.3, 0.9, -0.2
    parameters = np.zeros(free.n_parameters)
    for triple, angles in zip(triples, ((np.pi / 2, x, -np.pi / 2), (0, y, 0), (z, 0, 0)), strict=True):
        parameters[list(triple)] = angles
    others = sorted(set(range(free.n_parameters)) - {k for t in triples for k in t})
    parameters[others] = middle, shared
    expected = gate_state(program, np.array([x, y, middle, z, shared]))
    assert abs(np.vdot(expected, gate_state(free, parameters))) == pytest.approx(1.0, abs=1e-14)


def test_rotations_on_one_qubit_with_nothing_between_become_one_free_gate():
    program = rotations(1, [(1, 1, 0, 1.0), (0, 1, 1, 1.0)], 2)
    assert with_free_axes(program).n_parameters == 3
