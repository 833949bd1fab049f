"""How gates become fused groups and passes over memory."""

import numpy as np
import pytest

from thalweg.ansatz.ground import Ground
from thalweg.ansatz.hardware_efficient import HardwareEfficient
from thalweg.circuit.program import Gate, GateProgram
from thalweg.operators.pauli import PauliExpansion
from thalweg.simulate.register_passes import plan
from thalweg.simulate.register_plan import fused_steps, is_real

R, CZ, CNOT, H = Gate.ROTATION, Gate.CZ, Gate.CNOT, Gate.HADAMARD


def program(n, rows):
    kind, x, z = (np.array(column) for column in zip(*rows, strict=True))
    count = len(rows)
    return GateProgram(n, 0, kind.astype(np.uint8), x.astype(np.uint64), z.astype(np.uint64), np.arange(count), np.ones(count), count)


def layered(n, depth, rotations="ry-rz", entangler="ring"):
    nothing = PauliExpansion(n, np.empty(0, np.uint64), np.empty(0, np.uint64), np.empty(0))
    return HardwareEfficient(depth=depth, rotations=rotations, entangler=entangler).build(Ground(None, nothing, 0))


def kinds(rows, n=4):
    return [step.kind for step in fused_steps(program(n, rows))[0]]


@pytest.mark.parametrize("entangler", ["ring", "all-pairs"])
def test_all_diagonal_gates_of_a_layer_are_one_group(entangler):
    steps, _ = fused_steps(layered(6, depth=3, entangler=entangler))
    assert [step.kind for step in steps].count("phases") == 4
    assert [step.kind for step in steps].count("mix") == 24


@pytest.mark.parametrize("depth", [1, 4, 9])
def test_a_layer_costs_one_pass_over_memory(depth):
    assert len(plan(layered(20, depth), tile_bytes_bits=16).passes) == depth + 2


def test_a_register_that_fits_the_cache_is_one_pass():
    made = plan(layered(12, depth=8), tile_bytes_bits=16)
    assert [(part.tiles, part.local_bits) for part in made.passes] == [(1, 12)]


def test_long_programs_on_one_tile_are_cut_so_that_the_watch_is_asked():
    made = plan(layered(12, depth=200, rotations="ry-rz", entangler="line"), tile_bytes_bits=16)
    assert len(made.passes) == 1
    swaps = program(13, [(CNOT, 1 << a, 1 << b) for _ in range(4000) for a, b in ((0, 1), (1, 2), (2, 0))])
    assert len(plan(swaps, tile_bytes_bits=16).passes) > 1


def test_diagonal_gates_pass_rotations_that_they_commute_with():
    z01, x01, y01 = (R, 0, 0b11), (R, 0b11, 0), (R, 0b11, 0b11)
    assert kinds([z01, x01, y01, z01]) == ["phases", "turn", "turn"]
    assert kinds([z01, (R, 0b01, 0b01), z01]) == ["phases", "mix", "phases"]
    assert kinds([z01, (R, 0b100, 0b100), (CZ, 1, 2)]) == ["mix", "phases"]
    assert kinds([(R, 0, 1), (H, 1, 0), (R, 0, 1)]) == ["phases", "mix", "phases"]
    assert kinds([(CZ, 1, 2), (CNOT, 1, 4), (R, 0, 1)]) == ["flip", "phases"]
    assert kinds([(CZ, 1, 2), (CNOT, 4, 1), (R, 0, 1)]) == ["phases", "flip", "phases"]


def test_turns_about_x_become_turns_about_y_between_diagonal_gates():
    assert kinds([(R, 1, 0)]) == ["phases", "mix", "phases"]
    cost, mixers = (R, 0, 0b11), [(R, 1, 0), (R, 2, 0)]
    assert kinds([cost, *mixers, cost, *mixers]) == ["phases", "mix", "mix", "phases", "mix", "mix", "phases"]


def test_amplitudes_are_real_when_every_rotation_has_an_odd_number_of_y():
    assert is_real(layered(4, 2, rotations="ry"))
    assert not is_real(layered(4, 2, rotations="ry-rz"))
    assert is_real(program(3, [(R, 0b111, 0b001), (H, 1, 0), (CNOT, 1, 2), (CZ, 1, 2)]))
    assert not is_real(program(3, [(R, 0b011, 0b011)]))


def test_a_string_that_flips_more_qubits_than_a_tile_has_is_streamed():
    made = plan(program(14, [(R, (1 << 14) - 1, 1), (R, 1 << 13, 1 << 13)]), tile_bytes_bits=8)
    assert [part.streamed for part in made.passes] == [True, False]
