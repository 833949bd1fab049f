"""A combination of determinants as a combination of basis states of a register."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from thalweg.encoding.linear import LinearEncoding
from thalweg.encoding.occupations import interleave, order_signs
from thalweg.encoding.symmetry import Tapering
from thalweg.operators.fermion import WeightedDeterminant


def basis_states(terms: Sequence[WeightedDeterminant], linear: LinearEncoding, tapering: Tapering) -> dict[int, float] | None:
    """Amplitudes by basis state of the working register; None where one of them lies outside the tapered sector."""
    alpha, beta = (np.array([term[spin] for term in terms], np.uint64) for spin in (1, 2))
    signs = [float(order_signs(a[None], b[None])[0, 0]) for a, b in zip(alpha, beta, strict=True)]
    bits = linear.encode(interleave(alpha) | interleave(beta) << np.uint64(1))
    if not tapering.holds(bits).all():
        return None
    working = tapering.strip(bits).tolist()
    return {b: sign * term.amplitude for b, sign, term in zip(working, signs, terms, strict=True)}
