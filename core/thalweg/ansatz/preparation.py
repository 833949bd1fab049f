"""Fixed gates that prepare a spin model's reference from a basis state."""

from __future__ import annotations

import numpy as np

from thalweg.ansatz.ground import Ground
from thalweg.circuit.program import Gate, GateProgram
from thalweg.errors import StudyError


def reference_program(ground: Ground, order: str = "") -> GateProgram:
    """The reference as a program without parameters, for rotations to be appended.

    `plus`: a Hadamard on every qubit. `singlets`: (|01> - |10>) / sqrt 2 of each pair, from |11> by a Hadamard and a CNOT.
    StudyError where the state does not lie in the sector that tapering kept.
    """
    bits, rows = ground.reference_bits, []
    if ground.reference_kind in ("plus", "singlets"):
        _refuse_tapering(ground)
        bits = 0
    if ground.reference_kind == "plus":
        rows = [(Gate.HADAMARD, 1 << q, 0) for q in range(ground.qubits.n_qubits)]
    elif ground.reference_kind == "singlets":
        for a, b in ground.reference_pairs:
            bits |= 1 << a | 1 << b
            rows += [(Gate.HADAMARD, 1 << a, 0), (Gate.CNOT, 1 << a, 1 << b)]
    return GateProgram(
        n_qubits=ground.qubits.n_qubits,
        reference=bits,
        kind=np.array([kind for kind, _, _ in rows], np.uint8),
        x=np.array([x for _, x, _ in rows], np.uint64),
        z=np.array([z for _, _, z in rows], np.uint64),
        parameter=np.full(len(rows), -1, np.int64),
        factor=np.zeros(len(rows)),
        n_parameters=0,
        order=order,
    )


def _refuse_tapering(ground: Ground) -> None:
    if ground.encoded is not None and ground.encoded.symmetries:
        raise StudyError(
            "The reference cannot be prepared on the tapered register",
            "it is a superposition of several sectors of the symmetries that were removed",
            "Switch tapering off, or choose a reference that is a basis state",
            "encoding.taper",
        )
