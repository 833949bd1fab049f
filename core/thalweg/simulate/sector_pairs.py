"""Lists of string pairs that an excitation of one spin connects; one list for each different excitation."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import Excitation
from thalweg.kernels.bits import excitation_pairs
from thalweg.operators.sector_layout import StringSpace

#: (source, target) orbitals of one spin.
OneSpin = tuple[tuple[int, ...], tuple[int, ...]]


@dataclass(frozen=True)
class SpinPairs:
    """Pairs of every different excitation of one spin, one after another, each sorted by the irrep of its first string.

    Attributes:
        first: where the pairs of excitation e and irrep h begin: first[e, h] to first[e, h + 1], shape (E, G + 1).
        start, end: strings (alpha: rows; beta: columns within an irrep), shape (P,).
        sign: +-1, shape (P,).
    """

    first: IntArray
    start: IntArray
    end: IntArray
    sign: FloatArray


def pair_lists(space: StringSpace, excitations: list[OneSpin], *, rows: bool, phase: FloatArray | None = None) -> tuple[SpinPairs, IntArray]:
    """The pairs of each different excitation, and which of them each of the given excitations is, shape (F,).

    phase: sign of each string against the natural order of orbitals, shape (N,); None where it is 1.
    """
    known: dict[OneSpin, int] = {}
    which = np.array([known.setdefault(e, len(known)) for e in excitations], dtype=np.int64)
    firsts, starts, ends, signs = [], [], [], []
    total = 0
    for source, target in known:
        start, end, sign = excitation_pairs(space.strings, space.inverse, space.binomial, _array(source), _array(target))
        firsts.append(total + np.searchsorted(start, space.first))  # strings are sorted by irrep
        starts.append(start)
        ends.append(end)
        signs.append(sign if phase is None else sign * phase[start] * phase[end])
        total += start.size
    start, end = _joined(starts, np.int64), _joined(ends, np.int64)
    if not rows:
        start, end = space.local[start], space.local[end]
    first = np.array(firsts, dtype=np.int64).reshape(len(known), space.first.size)
    return SpinPairs(first, start, end, _joined(signs, np.float64)), which


def one_spin(e: Excitation, alpha: bool) -> OneSpin:
    """What an excitation does to one spin."""
    return (e.alpha_source, e.alpha_target) if alpha else (e.beta_source, e.beta_target)


def _array(orbitals: tuple[int, ...]) -> IntArray:
    return np.array(orbitals, dtype=np.int64)


def _joined(arrays: list[np.ndarray], kind: type) -> np.ndarray:
    return np.concatenate(arrays).astype(kind) if arrays else np.empty(0, kind)
