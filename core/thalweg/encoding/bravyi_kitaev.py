"""The Bravyi-Kitaev encoding of fermionic modes on qubits."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.encoding.settings import EncodingSettings


class BravyiKitaev(EncodingSettings):
    title: ClassVar[str] = "Bravyi-Kitaev"
    about: ClassVar[str] = "Binary-tree partial sums; string weight grows with log n (Bravyi and Kitaev 2002)."

    key: Literal["bravyi-kitaev"] = "bravyi-kitaev"
