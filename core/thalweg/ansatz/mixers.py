"""Operators that turn the basis states of a diagonal cost into each other, as groups of commuting strings."""

from __future__ import annotations

import numpy as np

from thalweg.ansatz.commuting_groups import TermGroup


def transverse(n: int) -> tuple[TermGroup, ...]:
    """-sum_q X_q (Farhi, Goldstone and Gutmann 2014), whose lowest state is all plus."""
    x = np.array([1 << q for q in range(n)], np.uint64)
    return (TermGroup(f"mixer -X on {n} {'site' if n == 1 else 'sites'}", x, np.zeros_like(x), np.full(n, -1.0), np.arange(n)),)


def ring(n: int) -> tuple[TermGroup, ...]:
    """-(X X + Y Y) / 2 of neighbours on a ring: even bonds, odd bonds, and the last one of an odd ring (Hadfield et al. 2019).

    Keeps the number of ones.
    """
    bonds = [(q, (q + 1) % n) for q in range(n if n > 2 else n - 1)]
    last = [bonds.pop()] if n % 2 and n > 2 else []
    return tuple(_exchange(part) for part in (bonds[0::2], bonds[1::2], last) if part)


def _exchange(bonds: list[tuple[int, int]]) -> TermGroup:
    pairs = np.repeat(np.array([1 << a | 1 << b for a, b in bonds], np.uint64), 2)
    z = pairs.copy()
    z[0::2] = 0
    label = f"mixer -(XX+YY)/2 on {len(bonds)} {'bond' if len(bonds) == 1 else 'bonds'}"
    return TermGroup(label, pairs, z, np.full(pairs.size, -0.5), np.repeat(np.arange(len(bonds)), 2))
