"""Array aliases and the glossary of dimensions used in docstrings.

M  spatial orbitals of the active space        n  qubits
Na, Nb  alpha and beta strings of the sector   L  Pauli terms
K  parameters                                  F  factors (rotations) of a program
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
IntArray = NDArray[np.int64]
MaskArray = NDArray[np.uint64]


def plain(values: FloatArray) -> tuple[float, ...]:
    """The numbers of an array of one axis, as records hold them."""
    return tuple(float(v) for v in values)
