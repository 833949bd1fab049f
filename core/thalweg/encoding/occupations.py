"""Occupations of spin orbitals: interleaved masks, determinants in the order of sector states, and their text."""

from __future__ import annotations

from itertools import combinations

import numpy as np

from thalweg.arrays import FloatArray, MaskArray
from thalweg.operators.fermion import Sector

ONE = np.uint64(1)


def interleave(masks: MaskArray) -> MaskArray:
    """Moves bit p to bit 2 p (alpha spin orbitals; shift by one for beta), any shape."""
    masks = np.asarray(masks, np.uint64)
    result = np.zeros_like(masks)
    for p in range(32):
        result |= (masks >> np.uint64(p) & ONE) << np.uint64(2 * p)
    return result


def alpha_beta_masks(occupations: int) -> tuple[int, int]:
    """Orbital masks of alpha and beta electrons in a mask of interleaved spin orbitals."""
    alpha = beta = 0
    for p in range((occupations.bit_length() + 1) // 2):
        alpha |= (occupations >> 2 * p & 1) << p
        beta |= (occupations >> (2 * p + 1) & 1) << p
    return alpha, beta


def determinant_masks(sector: Sector) -> tuple[MaskArray, MaskArray]:
    """Alpha and beta strings of the sector, ascending, shapes (Na,) and (Nb,)."""
    return _strings(sector.n_orbitals, sector.n_alpha), _strings(sector.n_orbitals, sector.n_beta)


def order_signs(alpha: MaskArray, beta: MaskArray) -> FloatArray:
    """Sign between prod a+_alpha prod a+_beta |vacuum> and the product in interleaved order, shape (Na, Nb).

    An alpha operator of orbital p passes every beta operator of an orbital below p.
    """
    odd = np.zeros((alpha.size, beta.size), np.uint8)
    for p in range(int(alpha.max(initial=0)).bit_length()):
        has = (alpha >> np.uint64(p) & ONE).astype(np.uint8)
        below = np.bitwise_count(beta & np.uint64((1 << p) - 1)) & 1
        odd ^= has[:, None] & below[None, :]
    return 1.0 - 2.0 * odd.astype(np.float64)


def occupation_text(alpha: int, beta: int, sector: Sector) -> str:
    """`22 0ab`: 2 doubly occupied, a alpha, b beta, 0 empty; lowest orbital first, a gap behind the larger electron number."""
    letters = "".join("0ab2"[(alpha >> p & 1) + 2 * (beta >> p & 1)] for p in range(sector.n_orbitals))
    gap = max(sector.n_alpha, sector.n_beta)
    return f"{letters[:gap]} {letters[gap:]}".strip()


def orbital_list(modes: int) -> str:
    """`0a 0b 3a` for a mask of interleaved spin orbitals."""
    return " ".join(f"{i // 2}{'ab'[i % 2]}" for i in range(modes.bit_length()) if modes >> i & 1)


def _strings(n_orbitals: int, n_electrons: int) -> MaskArray:
    masks = [sum(1 << p for p in chosen) for chosen in combinations(range(n_orbitals), n_electrons)]
    return np.sort(np.array(masks, np.uint64))
