"""Published figures of alternating operators (approximate optimisation) on cuts of unweighted graphs."""

from __future__ import annotations

import math


def ring_of_disagrees(p: int) -> float:
    """Largest expected part of the bonds cut at p layers, for rings of at least 2p + 2 sites.

    Farhi, Goldstone and Gutmann, arXiv:1411.4028 (2014); proved by way of free fermions by Wang, Hadfield, Jiang and Rieffel,
    Physical Review A 97, 022304 (2018), for p = 1, and numerically beyond.
    """
    return (2 * p + 1) / (2 * p + 2)


def triangle_free_regular(d: int) -> float:
    """Largest expected part of the bonds cut at p = 1 on d-regular graphs without triangles (Wang et al. 2018)."""
    return 0.5 + 0.5 / math.sqrt(d) * ((d - 1) / d) ** ((d - 1) / 2)


#: The same formula as a number, for d = 3.
CUBIC = 0.69245009
