"""The Parity encoding of fermionic modes on qubits."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.encoding.settings import EncodingSettings


class ParityEncoding(EncodingSettings):
    title: ClassVar[str] = "Parity"
    about: ClassVar[str] = "Each qubit holds the parity of all occupations up to it (Seeley, Richard and Love 2012)."

    key: Literal["parity"] = "parity"
