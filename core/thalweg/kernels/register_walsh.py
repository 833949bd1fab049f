"""The Walsh-Hadamard transform, in place."""

from __future__ import annotations

from numba import int64, njit

from thalweg.kernels.register_lanes import mix_lanes, mix_one, mix_three

_PAIR = (1.0, 1.0, 1.0, -1.0)  # (upper + lower, upper - lower)


@njit(cache=True, nogil=True)
def walsh_hadamard(values):  # type: ignore[no-untyped-def]
    """values[b] <- sum_z (-1)^popcount(b & z) values[z] for 2^m doubles, m >= 3."""
    three, size, stride = _PAIR + _PAIR + _PAIR, values.size, int64(8)
    mix_lanes((values,), size, three, 0)
    while 4 * stride < size:
        mix_three((values,), size, (stride, 2 * stride, 4 * stride), three)
        stride *= 8
    while stride < size:
        mix_one((values,), size, stride, _PAIR)
        stride *= 2
