"""The Abelian group of lattice translations and spin inversion under which a spin Hamiltonian does not change."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import product
from typing import Any

import numpy as np

from thalweg.arrays import IntArray
from thalweg.operators.conserved import conserves_parity, is_invariant
from thalweg.operators.pauli import PauliExpansion

Permutation = tuple[int, ...]
#: Orbits note which group elements leave a state alone in one word.
MAX_ORDER = 64


@dataclass(frozen=True)
class Character:
    """One one-dimensional representation.

    Attributes:
        values: chi(g) for each group element, shape (G,), real where all are +-1.
        momentum: fraction of a full turn for each translation; empty without translations.
        inversion: +1 or -1 under spin inversion, 0 without it.
        pairs: 2 when the complex conjugate is another representation (which is then not listed).
    """

    values: Any
    momentum: tuple[Fraction, ...]
    inversion: int
    pairs: int

    def label(self) -> str:
        """`momentum (pi, 0), even under spin inversion`."""
        words = []
        if self.momentum:
            listed = ", ".join(momentum_text(k) for k in self.momentum)
            words.append(f"momentum {'+-' if self.pairs == 2 else ''}{listed if len(self.momentum) == 1 else f'({listed})'}")
        if self.inversion:
            words.append(f"{'even' if self.inversion > 0 else 'odd'} under spin inversion")
        return ", ".join(words)


@dataclass(frozen=True)
class SymmetryGroup:
    """Elements as site permutations with or without spin inversion; the first is the identity.

    Attributes:
        permutations: shape (G, n); site q moves to entry q.
        inverts: whether all spins are inverted as well, shape (G,).
        characters: the representations; of complex pairs one stands for both where H is real.
    """

    permutations: IntArray
    inverts: Any
    characters: tuple[Character, ...]

    @property
    def order(self) -> int:
        return int(self.inverts.size)


def symmetry_group(expansion: PauliExpansion, translations: Sequence[Permutation], *, with_inversion: bool, real: bool) -> SymmetryGroup:
    """The group from those translations (or their powers) that leave H alone, and spin inversion if asked for and conserved."""
    steps = [step for step in (_symmetric_power(expansion, t) for t in translations) if step is not None]
    steps = [step for i, step in enumerate(steps) if all(_commute(step, other) for other in steps[:i])]
    inversion = with_inversion and conserves_parity(expansion, "x")
    elements = _elements(expansion.n_qubits, steps, inversion)
    if len(elements) > MAX_ORDER and inversion:
        inversion, elements = False, _elements(expansion.n_qubits, steps, False)
    while len(elements) > MAX_ORDER:
        steps.pop()
        elements = _elements(expansion.n_qubits, steps, False)
    permutations = np.array([p for p, _ in elements], dtype=np.int64).reshape(len(elements), expansion.n_qubits)
    characters = _characters(elements, [order_of(step) for step in steps], inversion, real)
    return SymmetryGroup(permutations, np.array([flip for _, flip in elements], dtype=bool), characters)


def order_of(permutation: Permutation) -> int:
    """The smallest power that is the identity."""
    power, count, identity = permutation, 1, tuple(range(len(permutation)))
    while power != identity:
        power, count = _after(permutation, power), count + 1
    return count


def momentum_text(fraction: Fraction) -> str:
    """A fraction of a full turn as `0`, `pi`, `2 pi/3`."""
    twice = 2 * fraction
    if twice == 0:
        return "0"
    top = "pi" if twice.numerator == 1 else f"{twice.numerator} pi"
    return top if twice.denominator == 1 else f"{top}/{twice.denominator}"


def byte_tables(permutation: IntArray) -> Any:
    """Where the bits of each byte of a mask go, shape (bytes, 256), uint64."""
    n = permutation.size
    tables = np.zeros(((n + 7) // 8, 256), dtype=np.uint64)
    for q in range(n):
        has = (np.arange(256) >> (q % 8)) & 1 == 1
        tables[q // 8, has] |= np.uint64(1) << np.uint64(permutation[q])
    return tables


Element = tuple[Permutation, bool]


def _elements(n: int, steps: Sequence[Permutation], inversion: bool) -> dict[Element, list[tuple[int, ...]]]:
    """Each group element with all the exponents of the generators that give it; the identity comes first."""
    powers = [_powers(step) for step in steps]
    found: dict[Element, list[tuple[int, ...]]] = {}
    for exponents in product(*(range(len(p)) for p in powers), range(2 if inversion else 1)):
        total: Permutation = tuple(range(n))
        for power, exponent in zip(powers, exponents[:-1], strict=True):
            total = _after(power[exponent], total)
        found.setdefault((total, bool(exponents[-1])), []).append(exponents)
    return found


def _characters(elements: dict[Element, list[tuple[int, ...]]], orders: list[int], inversion: bool, real: bool) -> tuple[Character, ...]:
    found: dict[tuple[Fraction, ...], Character] = {}
    for numbers in product(*(range(order) for order in orders), range(2 if inversion else 1)):
        turns = [Fraction(k, order) for k, order in zip(numbers, [*orders, 2], strict=True)]
        phases = []
        for exponents in elements.values():
            options = {sum((t * a for t, a in zip(turns, word, strict=True)), Fraction(0)) % 1 for word in exponents}
            phases.append(options)
        if any(len(options) > 1 for options in phases):
            continue  # contradicts a relation between the generators
        key = tuple(next(iter(options)) for options in phases)
        conjugate = tuple(-phase % 1 for phase in key)
        if real and conjugate in found:
            continue
        turned = 2j * np.pi * np.array([float(phase) for phase in key])
        values = np.exp(turned) if conjugate != key else np.cos(turned.imag).round()
        pairs = 2 if real and conjugate != key else 1
        found[key] = Character(values, tuple(turns[:-1]), (1 - 2 * numbers[-1]) if inversion else 0, pairs)
    return tuple(found.values())


def _symmetric_power(expansion: PauliExpansion, step: Permutation) -> Permutation | None:
    """The smallest power of the translation that leaves H alone; None when only the identity does."""
    if sorted(step) != list(range(expansion.n_qubits)):
        return None
    for power in _powers(step)[1:]:
        if is_invariant(expansion, power):
            return power
    return None


def _powers(step: Permutation) -> list[Permutation]:
    found: list[Permutation] = [tuple(range(len(step)))]
    while (following := _after(step, found[-1])) != found[0]:
        found.append(following)
    return found


def _after(second: Permutation, first: Permutation) -> Permutation:
    """First `first`, then `second`."""
    return tuple(second[q] for q in first)


def _commute(a: Permutation, b: Permutation) -> bool:
    return _after(a, b) == _after(b, a)
