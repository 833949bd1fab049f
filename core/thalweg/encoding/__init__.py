"""Fermions to qubits: one options class an encoding; the list order is the menu order."""

from thalweg.encoding.bravyi_kitaev import BravyiKitaev
from thalweg.encoding.jordan_wigner import JordanWigner
from thalweg.encoding.parity import ParityEncoding
from thalweg.encoding.settings import EncodingSettings
from thalweg.registry import Alternatives

ENCODINGS: Alternatives[EncodingSettings] = Alternatives("encoding", [JordanWigner, ParityEncoding, BravyiKitaev])

__all__ = ["ENCODINGS", "BravyiKitaev", "EncodingSettings", "JordanWigner", "ParityEncoding"]
