"""Gates that prepare a superposition of a few basis states (Gleinig and Hoefler, Design Automation Conference 2021).

Basis states are merged two at a time: CNOTs make a pair differ in one qubit, and a rotation of that qubit, under control of
the few qubits that tell the pair from all other basis states, joins them into one. The circuit runs the merges backward. For
L basis states on n qubits it takes some L n CNOTs, and rotations with at most about log2 L controls.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from itertools import combinations
from math import atan2, hypot

from thalweg.circuit.program import Gate, GateRow


@dataclass(frozen=True)
class _Merge:
    """Two basis states become one: `qubit` is turned by `angle` where every control has its value; before that the CNOTs act."""

    qubit: int
    flipped: tuple[int, ...]
    controls: tuple[tuple[int, int], ...]
    angle: float


def preparation(amplitudes: Mapping[int, float]) -> tuple[int, list[GateRow]]:
    """The basis state to begin with, and the gates that turn it into sum_b amplitudes[b] |b>, which is normalised and real."""
    left = {bits: float(amplitude) for bits, amplitude in amplitudes.items()}
    merges: list[_Merge] = []
    while len(left) > 1:
        merge = _next_merge(left)
        left = _merged(left, merge)
        merges.append(merge)
    gates: list[GateRow] = []
    for merge in reversed(merges):
        gates += _turn(merge)
        gates += [(Gate.CNOT, 1 << merge.qubit, 1 << q, -1, 0.0) for q in merge.flipped]
    return next(iter(left)), gates


def _next_merge(left: Mapping[int, float]) -> _Merge:
    """The two states that the fewest controls tell from the others, as far as halving finds them."""
    states = sorted(left)
    first, path = _narrowed(states, [])
    (qubit, value), controls = path[-1], path[:-1]
    others = [s for s in states if s != first and all(s >> q & 1 == v for q, v in controls)]
    second, further = _narrowed(others, controls)
    zero, one = (first, second) if value == 0 else (second, first)
    flipped = tuple(q for q in range((zero ^ one).bit_length()) if q != qubit and (zero ^ one) >> q & 1)
    held = tuple((q, zero >> q & 1) for q, _ in further)  # the CNOTs leave the state with 0 as it is, and make the other one like it
    return _Merge(qubit, flipped, held, 2.0 * atan2(left[one], left[zero]))


def _narrowed(states: list[int], path: list[tuple[int, int]]) -> tuple[int, list[tuple[int, int]]]:
    """One of the states, and (qubit, value) pairs, beginning with `path`, that it alone of them has: the smaller part at each turn."""
    path = list(path)
    while len(states) > 1:
        n = max(states).bit_length()
        parts = [(q, v, [s for s in states if s >> q & 1 == v]) for q in range(n) for v in (0, 1)]
        qubit, value, states = min(((q, v, part) for q, v, part in parts if part and len(part) < len(states)), key=lambda p: len(p[2]))
        path.append((qubit, value))
    return states[0], path


def _merged(left: Mapping[int, float], merge: _Merge) -> dict[int, float]:
    """The amplitudes after the CNOTs of the merge and the inverse of its rotation."""
    flips = sum(1 << q for q in merge.flipped)
    found: dict[int, float] = {}
    for bits, amplitude in left.items():
        bits = bits ^ flips if bits >> merge.qubit & 1 else bits
        if all(bits >> q & 1 == value for q, value in merge.controls):
            bits &= ~(1 << merge.qubit)
        found[bits] = hypot(found[bits], amplitude) if bits in found else amplitude
    return found


def _turn(merge: _Merge) -> list[GateRow]:
    """exp(-i angle/2 Y Pi) with Pi = prod_c (1 +- Z_c) / 2, as commuting rotations about Y times products of Z."""
    qubit, angle = 1 << merge.qubit, merge.angle / 2 ** len(merge.controls)
    gates: list[GateRow] = []
    for count in range(len(merge.controls) + 1):
        for chosen in combinations(merge.controls, count):
            sign = (-1) ** sum(value for _, value in chosen)
            gates.append((Gate.ROTATION, qubit, qubit | sum(1 << q for q, _ in chosen), -1, sign * angle))
    return gates
