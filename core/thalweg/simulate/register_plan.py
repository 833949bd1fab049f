"""A gate program made ready for the tile kernels: diagonal gates fused, gates gathered into passes over memory.

Order is changed only between gates that commute. Rotations about X of one qubit become a Y rotation between two fixed Z rotations,
which fuse with the diagonal gates around them.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import Gate, GateProgram

#: Gates that are no rotations, and the first rotation: rows of `Rotations.entries`.
NOTHING, HADAMARD, FIRST = range(3)
#: How far back a diagonal gate looks for a group to join.
WINDOW = 256


@dataclass
class Step:
    """One gate, or one group of diagonal gates, on qubit masks.

    Attributes:
        kind: `mix` (Y rotation or Hadamard on one qubit), `turn` (any other rotation with flips), `flip` (CNOT), `phases`.
        flips, support: qubits whose bits change, and all qubits acted on.
        gate: row of the rotation in `Rotations.entries`, or HADAMARD.
        z: z mask of a rotation; the target of a CNOT is in `flips`.
        terms: of `phases`: (z mask, gate number); fixed: z mask -> angle of rotations without parameter; pairs: controlled-Z masks.
    """

    kind: str
    flips: int = 0
    support: int = 0
    gate: int = HADAMARD
    z: int = 0
    terms: list[tuple[int, int]] = field(default_factory=list)
    fixed: dict[int, float] = field(default_factory=dict)
    pairs: list[int] = field(default_factory=list)

    @property
    def is_rotation(self) -> bool:
        return self.kind == "turn" or (self.kind == "mix" and self.gate != HADAMARD)


@dataclass(frozen=True)
class Rotations:
    """Where the angle of each rotation comes from: factor * theta[parameter], or factor itself for parameter -1; shapes (R,)."""

    parameter: IntArray
    factor: FloatArray

    def angles(self, parameters: FloatArray) -> FloatArray:
        if not np.any(self.parameter >= 0):
            return self.factor
        return np.where(self.parameter < 0, 1.0, np.asarray(parameters, dtype=np.float64)[self.parameter]) * self.factor

    def entries(self, angles: FloatArray) -> FloatArray:
        """2 x 2 matrices, row by row, for the kernels: NOTHING, HADAMARD, then (cos, -sin, sin, cos) of half of each angle."""
        rows = np.empty((FIRST + angles.size, 4))
        rows[FIRST:, 0] = rows[FIRST:, 3] = np.cos(0.5 * angles)
        rows[FIRST:, 2] = np.sin(0.5 * angles)
        rows[FIRST:, 1] = -rows[FIRST:, 2]
        rows[NOTHING] = 1.0, 0.0, 0.0, 1.0
        rows[HADAMARD] = np.array([1.0, 1.0, 1.0, -1.0]) * 0.5**0.5
        return rows

    def gradient(self, by_rotation: FloatArray, n_parameters: int) -> FloatArray:
        """Sums the derivatives by angle into derivatives by parameter, shape (K,)."""
        own = self.parameter >= 0
        total: FloatArray = np.bincount(self.parameter[own], weights=(self.factor * by_rotation)[own], minlength=n_parameters).astype(np.float64)
        return total


def is_real(program: GateProgram) -> bool:
    """Whether the amplitudes stay real: every rotation has an odd number of Y."""
    rotations = program.kind == Gate.ROTATION
    return bool(np.all(np.bitwise_count(program.x & program.z)[rotations] % 2 == 1))


def fused_steps(program: GateProgram) -> tuple[list[Step], Rotations]:
    """The program with adjacent (after commuting) diagonal gates in groups."""
    builder = _Fusion()
    rows = zip(program.kind.tolist(), program.x.tolist(), program.z.tolist(), program.parameter.tolist(), program.factor.tolist(), strict=True)
    for kind, x, z, parameter, factor in rows:
        if kind == Gate.ROTATION:
            builder.rotation(x, z, parameter, factor)
        elif kind == Gate.CZ:
            builder.group_for(Step("phases", 0, x | z)).pairs.append(x | z)
        elif kind == Gate.CNOT:
            builder.append(Step("flip", z, x | z))
        else:
            builder.append(Step("mix", x, x))
    return builder.finish()


class _Fusion:
    def __init__(self) -> None:
        self.steps: list[Step] = []
        self._parameter: list[int] = []
        self._factor: list[float] = []

    def rotation(self, x: int, z: int, parameter: int, factor: float) -> None:
        if x == 0:
            self._phase(z, parameter, factor)
        elif z == 0 and x & (x - 1) == 0:  # X = Rz(-pi/2) Y Rz(pi/2)
            self._phase(x, -1, np.pi / 2)
            self.append(Step("mix", x, x, self._gate(parameter, factor), x))
            self._phase(x, -1, -np.pi / 2)
        else:
            kind = "mix" if x == z and x & (x - 1) == 0 else "turn"
            self.append(Step(kind, x, x | z, self._gate(parameter, factor), z))

    def append(self, step: Step) -> None:
        """A step that flips bits; before the last group where they commute, so that the group can still grow."""
        last = self.steps[-1] if self.steps else None
        if last is not None and last.kind == "phases" and last.support & step.flips == 0:
            self.steps.insert(-1, step)
        else:
            self.steps.append(step)

    def group_for(self, single: Step) -> Step:
        """The group that a diagonal gate joins: the earliest that it reaches past steps it commutes with, else a new one."""
        found = None
        for step in reversed(self.steps[-WINDOW:]):
            if step.kind == "phases":
                found = step
            elif not _passes(single, step):
                break
        if found is None:
            found = Step("phases")
            self.steps.append(found)
        found.support |= single.support
        return found

    def finish(self) -> tuple[list[Step], Rotations]:
        for step in self.steps:
            for z, angle in step.fixed.items():
                if angle != 0.0:
                    step.terms.append((z, self._gate(-1, angle)))
        kept = [step for step in self.steps if step.kind != "phases" or step.terms or step.pairs]
        return kept, Rotations(np.array(self._parameter, dtype=np.int64), np.array(self._factor, dtype=np.float64))

    def _phase(self, z: int, parameter: int, factor: float) -> None:
        if parameter >= 0:
            gate = self._gate(parameter, factor)
            self.group_for(Step("phases", 0, z, terms=[(z, gate)])).terms.append((z, gate))
        else:
            group = self.group_for(Step("phases", 0, z, fixed={z: factor}))
            group.fixed[z] = group.fixed.get(z, 0.0) + factor

    def _gate(self, parameter: int, factor: float) -> int:
        self._parameter.append(parameter)
        self._factor.append(factor)
        return FIRST + len(self._parameter) - 1


def _passes(single: Step, step: Step) -> bool:
    """Whether one diagonal gate commutes with a step that flips bits."""
    if step.flips & single.support == 0:
        return True
    masks = [z for z, _ in single.terms] + list(single.fixed)
    return step.is_rotation and bool(masks) and all((z & step.flips).bit_count() % 2 == 0 for z in masks)


def passes(steps: list[Step], n_qubits: int, tile_bits: int, chunk_bits: int, most_steps: int) -> list[tuple[list[int], list[Step]]]:
    """(local qubits, steps) of each pass over memory. A step that flips more qubits than a tile has is a pass of its own, all local.

    Greedy: the low block, or the qubits that the waiting steps flip first, whichever lets more steps be done.
    """
    everything = list(range(n_qubits))
    if n_qubits <= tile_bits:
        return [(everything, steps[first : first + most_steps]) for first in range(0, len(steps), most_steps)]
    low = everything[:tile_bits]
    found: list[tuple[list[int], list[Step]]] = []
    waiting = steps
    while waiting:
        if needs_whole_register(waiting[0], tile_bits, chunk_bits):
            found.append((everything, waiting[:1]))
            waiting = waiting[1:]
            continue
        options = [(local, *_take(waiting, local, n_qubits, most_steps)) for local in (low, _needed_first(waiting, n_qubits, tile_bits, chunk_bits))]
        local, taken, waiting = max(options, key=lambda option: len(option[1]))
        found.append((local, taken))
    return found


def needs_whole_register(step: Step, tile_bits: int, chunk_bits: int) -> bool:
    """Whether the step flips more qubits than a tile can have as local ones."""
    return step.flips >> tile_bits != 0 and (step.flips | (1 << chunk_bits) - 1).bit_count() > tile_bits


def _needed_first(waiting: list[Step], n_qubits: int, tile_bits: int, chunk_bits: int) -> list[int]:
    local = (1 << chunk_bits) - 1
    for step in waiting:
        if (local | step.flips).bit_count() <= tile_bits:
            local |= step.flips
        if local.bit_count() == tile_bits:
            break
    for q in range(n_qubits):
        if local.bit_count() < tile_bits:
            local |= 1 << q
    return [q for q in range(n_qubits) if local >> q & 1]


def _take(waiting: list[Step], local: list[int], n_qubits: int, most_steps: int) -> tuple[list[Step], list[Step]]:
    """The steps that can be done now on these local qubits, and the rest. What is left behind blocks what does not commute with it."""
    taken: list[Step] = []
    left: list[Step] = []
    outside = ~sum(1 << q for q in local)
    left_flips = left_support = 0
    for position, step in enumerate(waiting):
        if step.flips & (left_support | outside) == 0 and left_flips & step.support == 0:
            taken.append(step)
        else:
            left.append(step)
            left_flips |= step.flips
            left_support |= step.support
        if len(taken) == most_steps or (left_flips and left_support.bit_count() == n_qubits):
            return taken, left + waiting[position + 1 :]
    return taken, left
