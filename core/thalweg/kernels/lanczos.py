"""The vector work of Lanczos steps, each in one pass over memory."""

from __future__ import annotations

from numba import njit


@njit(cache=True, nogil=True, fastmath={"reassoc", "contract", "nsz"})
def subtract(w, v, alpha):  # type: ignore[no-untyped-def]
    """w <- w - alpha v; returns |w|^2."""
    total = 0.0
    for i in range(w.size):
        value = w[i] - alpha * v[i]
        w[i] = value
        total += value.real * value.real + value.imag * value.imag
    return total


@njit(cache=True, nogil=True, fastmath={"reassoc", "contract", "nsz"})
def subtract_two(w, v, alpha, u, beta):  # type: ignore[no-untyped-def]
    """w <- w - alpha v - beta u; returns |w|^2."""
    total = 0.0
    for i in range(w.size):
        value = w[i] - alpha * v[i] - beta * u[i]
        w[i] = value
        total += value.real * value.real + value.imag * value.imag
    return total
