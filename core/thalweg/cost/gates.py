"""Gates and depth of a circuit in the usual set: one-qubit gates and CNOT."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thalweg.circuit.program import Gate, GateProgram
from thalweg.kernels.gates import count_gates

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
    kind = np.asarray(program.kind)
    is_pair = (kind == Gate.CZ) | (kind == Gate.CNOT)
    counts = count_gates(program.n_qubits, program.reference, kind == Gate.ROTATION, is_pair, program.x, program.z)
    return GateCounts(*counts.tolist())
