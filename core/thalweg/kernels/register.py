"""Gates on 2^n complex amplitudes, in place."""

from __future__ import annotations

from numba import njit, uint64

from thalweg.kernels.register_bits import sign

PHASES = (1.0 + 0.0j, 1.0j, -1.0 + 0.0j, -1.0j)


@njit(cache=True, nogil=True)
def rotate(state, x, z, phase, cosine, sine):  # type: ignore[no-untyped-def]
    """exp(-i angle/2 P), cosine and sine of angle/2, phase = i^|x&z|."""
    if x == 0:
        even, odd = complex(cosine, -sine), complex(cosine, sine)
        for a in range(uint64(state.size)):
            state[a] *= even if sign(a & z) > 0.0 else odd
        return
    top = uint64(1)
    while top <= x >> uint64(1):
        top <<= uint64(1)
    factor = -1j * sine * phase
    for a in range(uint64(state.size)):
        if a & top:
            continue
        b = a ^ x
        own, other = state[a], state[b]
        state[a] = cosine * own + factor * sign(b & z) * other
        state[b] = cosine * other + factor * sign(a & z) * own


@njit(cache=True, nogil=True)
def fixed_gate(state, kind, x, z):  # type: ignore[no-untyped-def]
    """CZ (1), CNOT (2), Hadamard (3); each is its own inverse."""
    for a in range(uint64(state.size)):
        if kind == 1:
            if a & x and a & z:
                state[a] = -state[a]
        elif kind == 2:
            if a & x and not a & z:
                state[a], state[a ^ z] = state[a ^ z], state[a]
        elif not a & x:
            lower, upper = state[a], state[a ^ x]
            state[a], state[a ^ x] = (lower + upper) * 0.5**0.5, (lower - upper) * 0.5**0.5


@njit(cache=True, nogil=True)
def generator_element(left, state, x, z, phase):  # type: ignore[no-untyped-def]
    """<left|P|state>."""
    total = 0.0j
    for a in range(uint64(state.size)):
        b = a ^ x
        total += left[a].conjugate() * sign(b & z) * state[b]
    return total * phase
