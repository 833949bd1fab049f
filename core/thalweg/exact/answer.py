"""The exact answer that every variational result stands beside."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True)
class ExactAnswer:
    """The lowest level of one symmetry sector.

    Attributes:
        energy: the level, in the Hamiltonian's unit (core energy included).
        degeneracy: multiplicity of the level inside the sector; for spin models over all sectors unless one S_z was asked for.
        gap: distance to the next level of the sector; None where the sector has no other level.
        vectors: orthonormal ground space, first axis = degeneracy; then the engine's state shape. None where they
            would not fit the memory budget (`method` says so).
        s_squared: <S^2> of the (first) ground state; None for systems without spin meaning.
        method: how it was found, one line.
        residual: |H v - E v|, the largest over the ground space.
        remarks: sentences, e.g. that another sector lies lower.
    """

    energy: float
    degeneracy: int
    gap: float | None
    vectors: Any
    s_squared: float | None
    method: str
    residual: float
    remarks: tuple[str, ...] = ()
