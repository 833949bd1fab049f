"""Free-axis selection: axis and angle of one single-qubit gate at a time, chosen together in closed form."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.structure import Structure
from thalweg.estimate import AXES, HARMONICS
from thalweg.optimize.objective import Objective
from thalweg.optimize.sequential_minimal import SequentialMinimal, lowest_along

_ROOT = 0.5**0.5


class FreeAxis(SequentialMinimal):
    """Watanabe et al. 2021 for the axis alone; with the angle as well, Wada et al. 2022.

    A single-qubit gate is a unit quaternion q, and the energy a quadratic form q^T S q: ten energies give S, its lowest eigenvector
    the best gate. The trial state's single-qubit rotations are replaced by gates with free axes beforehand (`circuit.axes`). Other
    parameters go by sequential minimal optimisation.
    """

    title: ClassVar[str] = "Free-axis selection"
    about: ClassVar[str] = (
        "Chooses axis and angle of each single-qubit gate at once, so short circuits reach further (Watanabe et al. 2021; Wada et al. 2022)."
    )
    needs: ClassVar[frozenset[str]] = frozenset({AXES, HARMONICS})

    key: Literal["free-axis"] = "free-axis"  # type: ignore[assignment]

    def energies_a_step(self, structure: Structure, gradient: int) -> int:
        gates, degrees = len(structure.triples), structure.degree.copy()
        degrees[[k for triple in structure.triples for k in triple]] = 0
        degrees = degrees[degrees > 0]
        return 9 * gates + 2 * int(degrees.sum()) + (1 if self.reuse else gates + degrees.size)

    def sweep(self, objective: Objective, x: FloatArray, rng: np.random.Generator) -> tuple[FloatArray, float]:
        triples = objective.structure.triples
        others = sorted(set(range(x.size)) - {k for triple in triples for k in triple})
        turns: list[tuple[int, ...]] = sorted([*triples, *((k,) for k in others)], key=min)
        if self.order == "shuffled":
            turns = [turns[i] for i in rng.permutation(len(turns)).tolist()]
        known: float | None = None
        for turn in turns:
            known = known if self.reuse else None
            x, known = lowest_along(objective, x, turn[0], known) if len(turn) == 1 else _best_gate(objective, x, np.array(turn), known)
        return x, objective.value(x) if known is None else known


def _best_gate(objective: Objective, x: FloatArray, triple: IntArray, known: float | None) -> tuple[FloatArray, float]:
    def energy(quaternion: FloatArray) -> float:
        there = x.copy()
        there[triple] = euler_angles(quaternion)
        return objective.value(there)

    basis = _basis_around(quaternion_of(x[triple]))  # the present gate is one of the four, and its energy may be known
    form = np.diag([known if known is not None and i == 0 else energy(basis[i]) for i in range(4)])
    for i in range(4):
        for j in range(i):
            form[i, j] = form[j, i] = energy(_ROOT * (basis[i] + basis[j])) - 0.5 * (form[i, i] + form[j, j])
    values, vectors = np.linalg.eigh(form)
    moved = x.copy()
    moved[triple] = euler_angles(vectors[:, 0] @ basis)
    return moved, float(values[0])


def quaternion_of(angles: FloatArray) -> FloatArray:
    """q of R_z(c) R_y(b) R_z(a) = q0 - i (q1 X + q2 Y + q3 Z), from (a, b, c)."""
    a, b, c = angles.tolist()
    total, gap = 0.5 * (a + c), 0.5 * (a - c)
    cosine, sine = np.cos(0.5 * b), np.sin(0.5 * b)
    return np.array([cosine * np.cos(total), sine * np.sin(gap), sine * np.cos(gap), cosine * np.sin(total)])


def euler_angles(q: FloatArray) -> FloatArray:
    """(a, b, c) with R_z(c) R_y(b) R_z(a) = q0 - i (q1 X + q2 Y + q3 Z)."""
    total, gap = np.arctan2(q[3], q[0]), np.arctan2(q[1], q[2])
    return np.array([total + gap, 2 * np.arctan2(np.hypot(q[1], q[2]), np.hypot(q[0], q[3])), total - gap])


def _basis_around(q: FloatArray) -> FloatArray:
    """Four orthonormal rows, the first of them q: its products with the units."""
    a, b, c, d = q.tolist()
    return np.array([[a, b, c, d], [-b, a, -d, c], [-c, d, a, -b], [-d, -c, b, a]])
