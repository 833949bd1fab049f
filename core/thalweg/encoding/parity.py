"""The Parity encoding of fermionic modes on qubits."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.encoding.settings import EncodingSettings


class ParityEncoding(EncodingSettings):
    title: ClassVar[str] = "Parity"
    about: ClassVar[str] = "Each qubit holds the parity of all occupations up to it (Seeley, Richard and Love 2012)."

    key: Literal["parity"] = "parity"

    def matrix(self, n: int) -> np.ndarray:
        """Lower triangle of ones, shape (n, n), uint8: qubit i holds the parity of modes 0 .. i."""
        return np.tril(np.ones((n, n), dtype=np.uint8))
