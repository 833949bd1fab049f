"""Single-qubit rotations turned into gates with a free axis: R_z R_y R_z, which is every rotation of one qubit up to its phase."""

from __future__ import annotations

import numpy as np

from thalweg.circuit.program import Gate, GateProgram, GateRow, gate_program


def with_free_axes(program: GateProgram) -> GateProgram:
    """Every single-qubit rotation with a parameter of its own becomes R_z(c) R_y(b) R_z(a) with the parameters (a, b, c), a acting first.

    Rotations that follow each other on one qubit, with no other gate on it between, become one such gate.
    """
    own = _own_parameters(program)
    open_gate: dict[int, int] = {}  # qubit -> its latest gate, while nothing else has touched the qubit
    rows: list[GateRow] = []
    labels: list[str] = []
    names, known, gates = program.labels(), dict[int, int](), 0
    for kind, x, z, parameter, factor in _rows(program):
        touched = x | z
        if kind == Gate.ROTATION and touched.bit_count() == 1 and parameter in own:
            if touched not in open_gate:
                open_gate[touched] = len(labels)
                rows += [(kind, mask, touched, len(labels) + i, 1.0) for i, mask in enumerate((0, touched, 0))]
                gates += 1
                labels += [f"{axis} of free gate {gates} on qubit {touched.bit_length() - 1}" for axis in ("first RZ", "RY", "last RZ")]
            continue
        for qubit in [q for q in open_gate if q & touched]:
            del open_gate[qubit]
        if parameter >= 0:
            if parameter not in known:
                known[parameter] = len(labels)
                labels.append(names[parameter])
            parameter = known[parameter]
        rows.append((kind, x, z, parameter, factor))
    return _program(program, rows, tuple(labels))


def axis_triples(program: GateProgram) -> tuple[tuple[int, int, int], ...]:
    """The parameters (a, b, c) of each R_z(c) R_y(b) R_z(a) in the program; factors are 1 and no other gate shares them."""
    own = _own_parameters(program)
    rows = _rows(program)
    found = []
    for three in zip(rows, rows[1:], rows[2:], strict=False):
        x, z = [row[1] for row in three], [row[2] for row in three]
        a, b, c = (row[3] for row in three)
        one_qubit = z[1].bit_count() == 1 and set(z) == {z[1]} and x == [0, z[1], 0]
        if one_qubit and {a, b, c} <= own and all(row[0] == Gate.ROTATION and row[4] == 1.0 for row in three):
            found.append((a, b, c))
    return tuple(found)


def _own_parameters(program: GateProgram) -> set[int]:
    """Parameters that exactly one gate takes."""
    turned = program.parameter[program.parameter >= 0]
    return set(np.flatnonzero(np.bincount(turned, minlength=1) == 1).tolist())


def _rows(program: GateProgram) -> list[GateRow]:
    columns = (program.kind, program.x, program.z, program.parameter, program.factor)
    return list(zip(*(column.tolist() for column in columns), strict=True))


def _program(program: GateProgram, rows: list[GateRow], labels: tuple[str, ...]) -> GateProgram:
    text = "single-qubit rotations with free axes, R_z R_y R_z"
    return gate_program(program.n_qubits, program.reference, rows, labels, f"{program.order}; {text}" if program.order else text)
