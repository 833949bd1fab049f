"""Gates and depth of a circuit in the usual set: one-qubit gates and CNOT."""

from __future__ import annotations

from dataclasses import dataclass

from thalweg.circuit.program import Gate, GateProgram

CONVENTION = (
    "A rotation about a string of weight w: 2 (w - 1) CNOT in a ladder, one RZ, and before and after it one basis change on each qubit "
    "with X or Y (RX, RY and RZ of weight 1 count as one gate); CZ counts as one two-qubit gate; nothing is cancelled between factors; "
    "depth lets gates on different qubits run at once; preparing the reference takes one X a set bit (common practice)."
)


@dataclass(frozen=True)
class GateCounts:
    """Counts under `convention`.

    Attributes:
        rotations: gates with a continuous angle.
        two_qubit: CNOT and CZ.
        single_qubit: all one-qubit gates, the rotations and the X of the reference included.
        depth: layers when each qubit runs its gates as early as it can.
        two_qubit_depth: the same with one-qubit gates taking no time.
    """

    rotations: int
    two_qubit: int
    single_qubit: int
    depth: int
    two_qubit_depth: int
    convention: str = CONVENTION


def gate_counts(program: GateProgram) -> GateCounts:
    """Counts the gates of a program written out in CNOT ladders; see `CONVENTION`."""
    clock = _Clock(program.n_qubits)
    for q in _qubits(program.reference):
        clock.single(q)
    rotations = 0
    for kind, x, z in zip(program.kind.tolist(), program.x.tolist(), program.z.tolist(), strict=True):
        if kind == Gate.ROTATION:
            rotations += _rotation(clock, x, z)
        elif kind == Gate.HADAMARD:
            clock.single(x.bit_length() - 1)
        else:
            clock.pair(x.bit_length() - 1, z.bit_length() - 1)
    return GateCounts(rotations, clock.two_qubit, clock.single_qubit, max(clock.times, default=0), max(clock.pair_times, default=0))


class _Clock:
    """Counts gates and keeps when each qubit is free again."""

    def __init__(self, n_qubits: int) -> None:
        self.times, self.pair_times = [0] * n_qubits, [0] * n_qubits
        self.single_qubit = self.two_qubit = 0

    def single(self, q: int) -> None:
        self.single_qubit += 1
        self.times[q] += 1

    def pair(self, a: int, b: int) -> None:
        self.two_qubit += 1
        for times in (self.times, self.pair_times):
            times[a] = times[b] = max(times[a], times[b]) + 1


def _rotation(clock: _Clock, x: int, z: int) -> int:
    """Basis changes, ladder, RZ, ladder, basis changes; 0 for the identity, which only turns the phase."""
    qubits = _qubits(x | z)
    if len(qubits) < 2:
        for q in qubits:
            clock.single(q)
        return len(qubits)
    turned = _qubits(x)
    for q in turned:
        clock.single(q)
    steps = list(zip(qubits, qubits[1:], strict=False))
    for a, b in steps:
        clock.pair(a, b)
    clock.single(qubits[-1])
    for a, b in reversed(steps):
        clock.pair(a, b)
    for q in turned:
        clock.single(q)
    return 1


def _qubits(mask: int) -> list[int]:
    return [q for q in range(mask.bit_length()) if mask >> q & 1]
