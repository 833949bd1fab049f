"""Bars B7 (layered circuit and chain expectation on 20 qubits) and B8 (backward sweep), against DRAM passes and the cirq simulator.

cirq serves as a general-purpose reference library: same circuit, same double precision, results compared before anything is timed.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from functools import cache
from typing import Any

import numpy as np

from thalweg.ansatz.ground import Ground
from thalweg.ansatz.hardware_efficient import HardwareEfficient
from thalweg.circuit.program import Gate, GateProgram
from thalweg.operators.pauli import PauliExpansion, collect_terms
from thalweg.operators.product import ExpansionProduct
from thalweg.simulate.register import RegisterEngine
from thalweg.simulate.register_passes import plan
from thalweg.simulate.register_run import PlanRunner, aligned
from thalweg.watch import SILENT

QUBITS, DEPTH = 20, 4
Row = dict[str, object]


def b7_register_forward() -> list[Row]:
    """20 qubits, RY + RZ + CZ ring, depth 4: against one in-place DRAM pass for each gate, and against cirq."""
    program, parameters = layered_circuit()
    engine = RegisterEngine(chain(), program)
    state = engine.state(parameters)
    circuit, simulator, qubits = cirq_circuit(program, parameters)

    def reference() -> Any:
        return simulator.simulate(circuit, qubit_order=qubits[::-1]).final_state_vector  # cirq's first qubit is the most significant

    assert np.abs(reference() - state).max() < 1e-10
    runner, positions, angles = prepared_run()
    ours, theirs = interleaved(lambda: runner.forward(positions, angles, SILENT), reference)
    one_pass, gates = dram_pass(), program.kind.size
    share = ours / (gates * one_pass)
    text = f"20 qubits, {gates} gates: {ours * 1e3:.1f} ms against {gates} passes of {one_pass * 1e3:.2f} ms, at most"
    faster = theirs / ours
    return [
        row("B7", text, share, 0.35, at_least=False),
        row("B7", f"the same circuit: cirq complex128 {theirs * 1e3:.0f} ms / Thalweg {ours * 1e3:.1f} ms, at least", faster, 8, at_least=True),
    ]


def b7_register_expectation() -> list[Row]:
    """<H> of a 60-term chain on the state of the layered circuit."""
    program, parameters = layered_circuit()
    state = RegisterEngine(chain(), program).state(parameters)
    product = ExpansionProduct(chain())
    operator, places = cirq_chain()

    def reference() -> Any:
        return operator.expectation_from_state_vector(state, places, check_preconditions=False)

    assert abs(reference().real - product.expectation(state)) < 1e-10
    ours, theirs = interleaved(lambda: product.expectation(state), reference)
    text = f"expectation of 60 terms: cirq {theirs * 1e3:.0f} ms / Thalweg {ours * 1e3:.1f} ms, at least"
    return [row("B7", text, theirs / ours, 20, at_least=True)]


def b8_backward_sweep() -> list[Row]:
    """The backward sweep (both states, all gradients) against the forward run of the same circuit."""
    runner, positions, angles = prepared_run()
    adjoint = positions[::-1].copy()
    forward, backward = interleaved(
        lambda: runner.forward(positions, angles, SILENT), lambda: runner.backward(positions, adjoint, angles, SILENT), second_repeats=3
    )
    text = f"20 qubits: backward {backward * 1e3:.1f} ms / forward {forward * 1e3:.1f} ms, at most"
    return [row("B8", text, backward / forward, 3.8, at_least=False)]


BARS = [b7_register_forward, b7_register_expectation, b8_backward_sweep]


@cache
def chain() -> PauliExpansion:
    """The Heisenberg ring of 20 spins: 60 strings."""
    bonds = [1 << q | 1 << (q + 1) % QUBITS for q in range(QUBITS)]
    x, z = ([mask for b in bonds for mask in masks(b)] for masks in (lambda b: (b, b, 0), lambda b: (0, b, b)))
    return collect_terms(QUBITS, np.array(x, np.uint64), np.array(z, np.uint64), np.ones(len(x)))


@cache
def layered_circuit() -> tuple[GateProgram, Any]:
    program = HardwareEfficient(depth=DEPTH, rotations="ry-rz", entangler="ring").build(Ground(None, chain(), 0))
    return program, np.random.default_rng(1).normal(size=program.n_parameters)


def prepared_run() -> tuple[PlanRunner, Any, Any]:
    """(runner, a normalised state as positions, the angles); kernels are compiled."""
    program, parameters = layered_circuit()
    made = plan(program, 16)
    runner, positions = PlanRunner(made), aligned(2 << QUBITS)
    positions[:] = np.random.default_rng(2).normal(size=positions.size)
    positions /= np.linalg.norm(positions)
    angles = made.rotations.angles(parameters)
    runner.backward(positions, positions.copy(), angles, SILENT)
    return runner, positions, angles


def cirq_circuit(program: GateProgram, parameters: Any) -> tuple[Any, Any, Any]:
    import cirq

    qubits = cirq.LineQubit.range(QUBITS)
    circuit = cirq.Circuit()
    for kind, x, z, k in zip(program.kind.tolist(), program.x.tolist(), program.z.tolist(), program.parameter.tolist(), strict=True):
        if kind == Gate.CZ:
            circuit.append(cirq.CZ(qubits[x.bit_length() - 1], qubits[z.bit_length() - 1]))
        else:
            gate = cirq.ry if x else cirq.rz
            circuit.append(gate(parameters[k])(qubits[z.bit_length() - 1]))
    return circuit, cirq.Simulator(dtype=np.complex128), qubits


def cirq_chain() -> tuple[Any, Any]:
    import cirq

    qubits = cirq.LineQubit.range(QUBITS)
    operator = sum(p(qubits[q]) * p(qubits[(q + 1) % QUBITS]) for q in range(QUBITS) for p in (cirq.X, cirq.Y, cirq.Z))
    return operator, {qubit: QUBITS - 1 - q for q, qubit in enumerate(qubits)}  # axis 0 is the most significant


def dram_pass() -> float:
    """Seconds that an in-place scale takes for as many bytes as the register has, on an array larger than the caches."""
    x = np.ones(2**27)
    return least(lambda: np.multiply(x, 1.0000001, out=x), 5) * (16 << QUBITS) / x.nbytes


def interleaved(first: Callable[[], Any], second: Callable[[], Any], second_repeats: int = 1) -> tuple[float, float]:
    """Least seconds of each, taken in turn, after one call that is not timed."""
    first()
    second()
    pairs = [(least(first, 5), least(second, second_repeats)) for _ in range(4)]
    return min(a for a, _ in pairs), min(b for _, b in pairs)


def least(task: Callable[[], Any], rounds: int) -> float:
    best = np.inf
    for _ in range(rounds):
        begun = time.perf_counter()
        task()
        best = min(best, time.perf_counter() - begun)
    return float(best)


def row(bar: str, text: str, measured: float, limit: float, *, at_least: bool) -> Row:
    return {"bar": bar, "text": text, "measured": measured, "limit": limit, "met": measured >= limit if at_least else measured <= limit}
