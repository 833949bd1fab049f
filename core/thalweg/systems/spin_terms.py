"""Collecting the terms of a spin Hamiltonian."""

from __future__ import annotations

import numpy as np

from thalweg.errors import StudyError
from thalweg.operators.pauli import MAX_QUBITS, PauliExpansion, collect_terms


class SpinTerms:
    """A growing list of weighted Pauli strings on `n_sites` qubits; site q is qubit q."""

    def __init__(self, n_sites: int) -> None:
        if n_sites > MAX_QUBITS:
            raise StudyError("The lattice is too large", f"{n_sites} sites need more than {MAX_QUBITS} qubits", "Use a smaller lattice", "lattice")
        if n_sites < 1:
            raise StudyError("The lattice is empty", "it has no site", "Give it at least one site", "lattice")
        self.n_sites = n_sites
        self._x: list[int] = []
        self._z: list[int] = []
        self._c: list[float] = []

    def add(self, coefficient: float, x: int, z: int) -> None:
        """Adds coefficient times the string with these masks."""
        self._x.append(x)
        self._z.append(z)
        self._c.append(coefficient)

    def site(self, axis: str, site: int, coefficient: float) -> None:
        """Adds coefficient times sigma^axis on one site; axis is X, Y or Z."""
        bit = 1 << site
        self.add(coefficient, bit if axis in "XY" else 0, bit if axis in "YZ" else 0)

    def pair(self, axis: str, first: int, second: int, coefficient: float) -> None:
        """Adds coefficient times sigma^axis sigma^axis on two sites."""
        bits = 1 << first | 1 << second
        self.add(coefficient, bits if axis in "XY" else 0, bits if axis in "YZ" else 0)

    def exchange(self, first: int, second: int, xx: float, yy: float, zz: float) -> None:
        """Adds xx XX + yy YY + zz ZZ on two sites."""
        for axis, coefficient in zip("XYZ", (xx, yy, zz), strict=True):
            self.pair(axis, first, second, coefficient)

    def expansion(self) -> PauliExpansion:
        """The sum, equal strings added up; StudyError when nothing is left."""
        x, z = np.array(self._x, dtype=np.uint64), np.array(self._z, dtype=np.uint64)
        c = np.array(self._c, dtype=float)
        if not np.isfinite(c).all():
            raise StudyError("The Hamiltonian is not finite", "couplings are too large for a floating-point number", "Use smaller couplings", "model")
        rounding = 1e-15 * float(np.abs(c).max(initial=0.0))  # what sums that cancel leave behind
        summed = collect_terms(self.n_sites, x, z, c, rounding)
        if not len(summed):
            raise StudyError("The Hamiltonian is zero", "every coupling and field vanishes or there is no bond", "Set a coupling or a field", "model")
        return summed
