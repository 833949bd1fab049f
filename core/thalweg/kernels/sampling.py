"""Bit strings drawn from a register state turned to a measurement basis, and what they say of the strings read together.

A set of Pauli strings is read in one basis: masks x and z give the letter of each qubit (X: x, Z: z, Y: both). After the turn every
string of the set is a product of Z on its `support`. Sets lie one after another: set g has the strings first[g]:first[g + 1].
"""

from __future__ import annotations

import numpy as np
from numba import njit, uint64

from thalweg.kernels.register_bits import sign

_ROOT = 0.5**0.5


@njit(cache=True, nogil=True)
def turn_to_basis(state, x, z):  # type: ignore[no-untyped-def]
    """In place: H on qubits read in X, H S+ on those read in Y. state: (2^n,) complex."""
    q = 0
    while (1 << q) < state.size:
        bit = 1 << q
        if x & uint64(bit):
            factor = -1j if z & uint64(bit) else 1.0 + 0.0j
            for a in range(state.size):
                if not a & bit:
                    upper, lower = state[a], factor * state[a | bit]
                    state[a], state[a | bit] = _ROOT * (upper + lower), _ROOT * (upper - lower)
        q += 1


@njit(cache=True, nogil=True)
def draw(state, spacings, counts):  # type: ignore[no-untyped-def]
    """counts[b] <- how often the bit string b comes; state: (2^n,) amplitudes, not necessarily of norm 1.

    spacings: (shots + 1,) exponential variates, whose running sums divided by their total are sorted uniform variates; these are
    sent through the inverse of the cumulative distribution.
    """
    weight = 0.0
    for a in range(state.size):
        weight += state[a].real ** 2 + state[a].imag ** 2
    scale = weight / spacings.sum()
    counts[:] = 0
    shots, taken, last = spacings.size - 1, 0, 0
    reached, point = 0.0, spacings[0] * scale
    for a in range(state.size):
        probability = state[a].real ** 2 + state[a].imag ** 2
        if probability == 0.0:
            continue
        last = a
        reached += probability
        while taken < shots and point < reached:
            counts[a] += 1
            taken += 1
            point += spacings[taken] * scale
    counts[last] += shots - taken  # the sum of the probabilities may fall short by rounding


@njit(cache=True, nogil=True)
def value_of(outcome, support, coefficients, first, last):  # type: ignore[no-untyped-def]
    """sum of c_l (-1)^(bits of the outcome on the support of l) over strings first:last."""
    total = 0.0
    for term in range(first, last):
        total += coefficients[term] * sign(uint64(outcome) & support[term])
    return total


@njit(cache=True, nogil=True)
def sample_sets(state, x, z, first, support, coefficients, shots, spacings, sums):  # type: ignore[no-untyped-def]
    """Adds the values of the shots of every set to sums[g, 0] and their squares to sums[g, 1].

    spacings holds shots[g] + 1 variates for each set with shots, one set after another.
    """
    turned, counts = np.empty_like(state), np.empty(state.size, np.int64)
    begin = 0
    for g in range(x.size):
        if shots[g] == 0:
            continue
        end = begin + shots[g] + 1
        turned[:] = state
        turn_to_basis(turned, x[g], z[g])
        draw(turned, spacings[begin:end], counts)
        begin = end
        for outcome in range(state.size):
            if counts[outcome]:
                value = value_of(outcome, support, coefficients, first[g], first[g + 1])
                sums[g, 0] += counts[outcome] * value
                sums[g, 1] += counts[outcome] * value**2


@njit(cache=True, nogil=True)
def set_moments(state, x, z, first, support, coefficients, moments):  # type: ignore[no-untyped-def]
    """moments[g] <- (mean, variance) of one shot of each set, shape (G, 2); the state has norm 1."""
    turned = np.empty_like(state)
    for g in range(x.size):
        turned[:] = state
        turn_to_basis(turned, x[g], z[g])
        mean, square = 0.0, 0.0
        for outcome in range(state.size):
            probability = turned[outcome].real ** 2 + turned[outcome].imag ** 2
            if probability > 1e-32:
                value = value_of(outcome, support, coefficients, first[g], first[g + 1])
                mean += probability * value
                square += probability * value**2
        moments[g, 0], moments[g, 1] = mean, max(square - mean**2, 0.0)
