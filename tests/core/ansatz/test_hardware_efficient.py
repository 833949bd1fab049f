"""The layered circuit as data."""

from dataclasses import replace

import numpy as np
import pytest

from thalweg.ansatz.ground import Ground
from thalweg.ansatz.hardware_efficient import HardwareEfficient, entangled_pairs
from thalweg.ansatz.preparation import reference_program
from thalweg.circuit.program import Gate
from thalweg.operators.pauli import PauliExpansion
from thalweg.simulate.register import RegisterEngine


def ground(n: int, reference: int = 0) -> Ground:
    z = np.array([1 << q for q in range(n)], dtype=np.uint64)
    return Ground(None, PauliExpansion(n, np.zeros(n, np.uint64), z, np.arange(1.0, n + 1)), reference)


@pytest.mark.parametrize(
    ("entangler", "n", "expected"),
    [
        ("line", 1, []),
        ("line", 4, [(0, 1), (1, 2), (2, 3)]),
        ("ring", 2, [(0, 1)]),
        ("ring", 3, [(0, 1), (1, 2), (0, 2)]),
        ("all-pairs", 4, [(0, 1), (0, 2), (0, 3), (1, 2), (1, 3), (2, 3)]),
    ],
)
def test_each_bond_of_the_entangler_is_there_once(entangler, n, expected):
    assert entangled_pairs(n, entangler) == expected


@pytest.mark.parametrize(("rotations", "axes"), [("ry", 1), ("ry-rz", 2)])
@pytest.mark.parametrize(("entangler", "bonds"), [("line", 4), ("ring", 5), ("all-pairs", 10)])
def test_gate_and_parameter_counts_follow_from_the_settings(rotations, axes, entangler, bonds):
    program = HardwareEfficient(depth=3, rotations=rotations, entangler=entangler).build(ground(5))
    assert program.n_parameters == 4 * 5 * axes == len(program.labels())
    assert len(set(program.labels())) == program.n_parameters
    assert int((program.kind == Gate.CZ).sum()) == 3 * bonds
    used = program.parameter[program.parameter >= 0]
    assert sorted(used.tolist()) == list(range(program.n_parameters))


@pytest.mark.parametrize("entangler", ["line", "ring", "all-pairs"])
@pytest.mark.parametrize("reference", [0b00000, 0b10110, 0b11111])
def test_zero_angles_leave_the_reference_unchanged_up_to_sign(entangler, reference):
    base = ground(5, reference)
    settings = HardwareEfficient(depth=2, rotations="ry-rz", entangler=entangler, start="zero")
    program = settings.build(base)
    start = settings.start_parameters(base, program, np.random.default_rng(0))
    state = RegisterEngine(base.qubits, program).state(start)
    assert not start.any()
    assert abs(state[reference]) == pytest.approx(1.0, abs=1e-14)
    assert np.count_nonzero(np.abs(state) > 1e-14) == 1


@pytest.mark.parametrize("entangler", ["line", "ring", "all-pairs"])
@pytest.mark.parametrize(
    "fields",
    [
        {"reference_kind": "plus"},
        {"reference_kind": "singlets", "reference_pairs": ((0, 2), (1, 3))},
        {"reference_kind": "combination", "reference_terms": ((0.6, 0b0111), (-0.8, 0b1011))},
    ],
    ids=lambda fields: fields["reference_kind"],
)
def test_a_superposition_comes_out_of_every_depth_and_is_continued_by_a_deeper_circuit(entangler, fields):
    base = replace(ground(4), **fields)
    rng = np.random.default_rng(3)
    wanted = RegisterEngine(base.qubits, reference_program(base)).state(np.zeros(0))
    for depth in (1, 2, 3):
        settings, deeper = (HardwareEfficient(depth=d, rotations="ry-rz", entangler=entangler) for d in (depth, depth + 1))
        program, longer = settings.build(base), deeper.build(base)
        at_zero = RegisterEngine(base.qubits, program).state(np.zeros(program.n_parameters))
        assert abs(np.vdot(wanted, at_zero)) == pytest.approx(1.0, abs=1e-12)
        angles = rng.normal(size=program.n_parameters)
        shallow = RegisterEngine(base.qubits, program).state(angles)
        deep = RegisterEngine(base.qubits, longer).state(deeper.from_shallower(angles, longer.n_parameters))
        assert abs(np.vdot(shallow, deep)) == pytest.approx(1.0, abs=1e-12)


def test_starts_are_repeatable_and_as_wide_as_stated():
    base = ground(6)
    small, wide = (HardwareEfficient(depth=200, start=start) for start in ("small-random", "uniform-random"))
    program = small.build(base)
    first, again = (small.start_parameters(base, program, np.random.default_rng(7)) for _ in range(2))
    np.testing.assert_array_equal(first, again)
    assert first.std() == pytest.approx(0.1, rel=0.1)
    angles = wide.start_parameters(base, program, np.random.default_rng(7))
    assert np.abs(angles).max() <= np.pi
    assert angles.std() == pytest.approx(np.pi / np.sqrt(3.0), rel=0.1)


def test_the_order_of_gates_is_stated_in_words():
    program = HardwareEfficient(depth=2, rotations="ry-rz", entangler="ring").build(ground(3))
    assert program.order == "RY then RZ on every qubit; then 2 times: CZ around a ring, RY then RZ on every qubit"
    assert program.labels()[0] == "RY on qubit 0 before the first entangling layer"
    assert program.labels()[-1] == "RZ on qubit 2 after entangling layer 2"
