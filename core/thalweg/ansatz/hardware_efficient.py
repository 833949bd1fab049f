"""Hardware-efficient layered circuit: rotations on every qubit, then entangling gates, repeated."""

from __future__ import annotations

from itertools import combinations
from typing import ClassVar, Literal

import numpy as np

from thalweg.ansatz.ground import Ground
from thalweg.ansatz.preparation import reference_program
from thalweg.ansatz.starts import PLAIN_START_HELP, PlainStart, start_angles
from thalweg.arrays import FloatArray
from thalweg.circuit.program import Gate, GateProgram, GateRow
from thalweg.options import Options, option


class HardwareEfficient(Options):
    """Settings of the layered circuit (Kandala et al. 2017)."""

    title: ClassVar[str] = "Hardware-efficient layers"
    about: ClassVar[str] = "Short circuits; need not keep particle number or spin, and gradients vanish for deep ones (McClean et al. 2018)."
    depth_field: ClassVar[str] = "depth"

    key: Literal["hardware-efficient"] = "hardware-efficient"
    depth: int = option(3, "Depth", "Number of entangling layers.", ge=1, le=200)
    rotations: Literal["ry", "ry-rz"] = option("ry", "Rotations", "Rotation gates on every qubit in each layer.")
    entangler: Literal["line", "ring", "all-pairs"] = option("line", "Entangler", "Which pairs of qubits the controlled-Z gates of a layer join.")
    start: PlainStart = option("small-random", "Start", PLAIN_START_HELP)

    def build(self, ground: Ground) -> GateProgram:
        """Rotations on every qubit before the first and after each entangling layer, each with its own parameter.

        At zero angles the reference comes out unchanged up to its sign: CZ is diagonal, and a superposition is begun with the signs that
        an odd number of entangling layers takes away.
        """
        n = ground.qubits.n_qubits
        pairs = entangled_pairs(n, self.entangler)
        begin = reference_program(ground, signs=pairs if self.depth % 2 else ())
        rows: list[GateRow] = []
        labels: list[str] = []
        for layer in range(self.depth + 1):
            if layer:
                rows += [(Gate.CZ, 1 << a, 1 << b, -1, 0.0) for a, b in pairs]
            self._rotation_layer(n, layer, rows, labels)
        kind, x, z, parameter, factor = zip(*rows, strict=True)
        return begin.followed_by(kind, x, z, parameter, factor, labels, self._order())

    def start_parameters(self, ground: Ground, program: GateProgram, rng: np.random.Generator) -> FloatArray:
        """Angles in radians, shape (K,)."""
        return start_angles(self.start, program.n_parameters, rng)

    def from_shallower(self, parameters: FloatArray, n_parameters: int) -> FloatArray:
        """Parameters that give the state of fewer layers up to its sign: the new ones act first, where CZ leaves the reference alone."""
        return np.concatenate([np.zeros(n_parameters - parameters.size), parameters])

    def _rotation_layer(self, n: int, layer: int, rows: list[GateRow], labels: list[str]) -> None:
        where = f"after entangling layer {layer}" if layer else "before the first entangling layer"
        for axis in self.rotations.upper().split("-"):
            for q in range(n):
                x = 1 << q if axis == "RY" else 0
                rows.append((Gate.ROTATION, x, 1 << q, len(labels), 1.0))
                labels.append(f"{axis} on qubit {q} {where}")

    def _order(self) -> str:
        rotations = " then ".join(self.rotations.upper().split("-"))
        joined = {"line": "along a line", "ring": "around a ring", "all-pairs": "between all pairs"}[self.entangler]
        return f"{rotations} on every qubit; then {self.depth} times: CZ {joined}, {rotations} on every qubit"


def entangled_pairs(n: int, entangler: str) -> list[tuple[int, int]]:
    """The pairs of qubits of one entangling layer. A ring of two qubits has one bond, not two."""
    if entangler == "all-pairs":
        return list(combinations(range(n), 2))
    pairs = [(q, q + 1) for q in range(n - 1)]
    return [*pairs, (0, n - 1)] if entangler == "ring" and n > 2 else pairs
