"""Fixed gates that prepare the reference from a basis state."""

from __future__ import annotations

from collections.abc import Sequence

from thalweg.ansatz.ground import Ground
from thalweg.circuit.program import Gate, GateProgram, GateRow, gate_program
from thalweg.circuit.sparse_state import preparation
from thalweg.errors import StudyError


def reference_program(ground: Ground, order: str = "", signs: Sequence[tuple[int, int]] = ()) -> GateProgram:
    """The reference as a program without parameters, for rotations to be appended.

    `plus`: a Hadamard on every qubit. `singlets`: (|01> - |10>) / sqrt 2 of each pair, from |11> by a Hadamard and a CNOT.
    A combination of basis states: see `circuit.sparse_state`. A superposition has a CZ on every pair of `signs` act on it: by gates,
    or by the amplitudes of a combination. StudyError where the state does not lie in the sector that tapering kept.
    """
    bits, rows = _gates(ground, signs)
    if rows and not ground.begins_combined:
        rows = rows + [_fixed(Gate.CZ, 1 << a, 1 << b) for a, b in signs]
    return gate_program(ground.qubits.n_qubits, bits, rows, order=order)


def _gates(ground: Ground, signs: Sequence[tuple[int, int]]) -> tuple[int, list[GateRow]]:
    """The basis state to begin with, and the gates that act on it."""
    if ground.begins_combined:
        return preparation({bits: amplitude * _sign(bits, signs) for bits, amplitude in _combination(ground).items()})
    if ground.reference_kind in ("plus", "singlets") and ground.encoded is not None and ground.encoded.symmetries:
        raise _outside_tapering()
    if ground.reference_kind == "plus":
        return 0, [_fixed(Gate.HADAMARD, 1 << q) for q in range(ground.qubits.n_qubits)]
    if ground.reference_kind == "singlets":
        pairs = ground.reference_pairs
        gates = [gate for a, b in pairs for gate in (_fixed(Gate.HADAMARD, 1 << a), _fixed(Gate.CNOT, 1 << a, 1 << b))]
        return sum(1 << a | 1 << b for a, b in pairs), gates
    return ground.reference_bits, []


def _sign(bits: int, pairs: Sequence[tuple[int, int]]) -> int:
    """What a CZ on each of these pairs makes of a basis state."""
    return -1 if sum(bits >> a & bits >> b & 1 for a, b in pairs) % 2 else 1


def _combination(ground: Ground) -> dict[int, float]:
    """Amplitudes by basis state of the register."""
    if ground.fermions is None:
        return {bits: amplitude for amplitude, bits in ground.reference_terms}
    from thalweg.encoding.combination import basis_states

    encoded = ground.encoded
    assert encoded is not None
    assert encoded.linear is not None
    found = basis_states(ground.fermions.reference_terms, encoded.linear, encoded.tapering)
    if found is None:
        raise _outside_tapering()
    return found


def _fixed(kind: Gate, x: int, z: int = 0) -> GateRow:
    return kind, x, z, -1, 0.0


def _outside_tapering() -> StudyError:
    return StudyError(
        "The reference cannot be prepared on the tapered register",
        "it is a superposition of several sectors of the symmetries that were removed",
        "Switch tapering off, or choose a reference that is a basis state",
        "encoding.taper",
    )
