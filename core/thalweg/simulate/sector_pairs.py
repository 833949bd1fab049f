"""Lists of string pairs that an excitation of one spin connects; one list for each different excitation."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import Excitation
from thalweg.kernels.bits import many_pairs
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
    orbitals = np.full((len(known), 2, max((len(source) for source, _ in known), default=0)), -1, np.int64)
    for n, (source, target) in enumerate(known):
        orbitals[n, 0, : len(source)], orbitals[n, 1, : len(target)] = source, target
    first, start, end, sign = many_pairs(space.strings, space.inverse, space.binomial, space.first, orbitals)
    if phase is not None:
        sign *= phase[start] * phase[end]
    if not rows:
        start, end = space.local[start], space.local[end]
    return SpinPairs(first, start, end, sign), which


def one_spin(e: Excitation, alpha: bool) -> OneSpin:
    """What an excitation does to one spin."""
    return (e.alpha_source, e.alpha_target) if alpha else (e.beta_source, e.beta_target)
