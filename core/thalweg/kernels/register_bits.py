"""Bit counting inside compiled code."""

from __future__ import annotations

from typing import Any

from numba import njit, types
from numba.extending import intrinsic


@intrinsic
def popcount(typingctx: Any, mask: Any) -> Any:
    """Number of set bits of a 64-bit mask, as int64: one machine instruction through LLVM's `ctpop`."""
    if not isinstance(mask, types.Integer) or mask.bitwidth != 64:
        return None

    def codegen(context: Any, builder: Any, signature: Any, arguments: Any) -> Any:
        return builder.ctpop(arguments[0])

    return types.int64(mask), codegen


@njit(cache=True, nogil=True)
def sign(mask):  # type: ignore[no-untyped-def]
    """(-1)^(number of set bits of a 64-bit mask)."""
    return 1.0 - 2.0 * (popcount(mask) & 1)
