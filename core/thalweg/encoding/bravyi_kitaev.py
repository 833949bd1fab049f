"""The Bravyi-Kitaev encoding of fermionic modes on qubits."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.encoding.settings import EncodingSettings


class BravyiKitaev(EncodingSettings):
    title: ClassVar[str] = "Bravyi-Kitaev"
    about: ClassVar[str] = "Binary-tree partial sums; string weight grows with log n (Bravyi and Kitaev 2002)."

    key: Literal["bravyi-kitaev"] = "bravyi-kitaev"

    def matrix(self, n: int) -> np.ndarray:
        """Partial sums of a binary indexed tree (Fenwick 1994), shape (n, n), uint8, for any n.

        Counted from 1, qubit i holds the parity of modes i - l + 1 .. i, where l is the lowest set bit of i.
        """
        row, column = np.arange(1, n + 1)[:, None], np.arange(1, n + 1)[None, :]
        return ((column > row - (row & -row)) & (column <= row)).astype(np.uint8)
