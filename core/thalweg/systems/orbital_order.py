"""Mean field orbitals brought into an order and phases that depend on the settings alone."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.systems.active_space import DEGENERATE
from thalweg.systems.gaussian_basis import pyscf_module

#: Orbital energies nearer than this are one level whose orbitals may be turned into each other, Eh.
_SAME_LEVEL = 1e-7
_GROUP_ORDER = {"D2h": 8, "C2v": 4, "C2h": 4, "D2": 4, "Cs": 2, "Ci": 2, "C2": 2}


@dataclass(frozen=True)
class MeanField:
    """Orbitals in their final order: doubly occupied, singly occupied, empty; by energy, then by irrep.

    Attributes:
        solver: the PySCF object, holding these orbitals.
        energy: Eh, nuclear repulsion included.
        orbitals: shape (functions, orbitals).
        energies, occupation: shape (orbitals,), Eh; 2, 1 or 0.
        irreps: labels whose product is the bitwise xor, shape (orbitals,); all 0 without a point group.
        irrep_names: name of each label, empty without a point group.
        iterations: of all solutions together.
        breaks_group: whether a lower solution outside the point group was told of.
        turned: orbitals, counted from 0, whose sign is not the standard one.
    """

    solver: Any
    energy: float
    orbitals: FloatArray
    energies: FloatArray
    occupation: FloatArray
    irreps: IntArray
    irrep_names: tuple[str, ...]
    iterations: int
    converged: bool
    stability: str
    warnings: tuple[str, ...]
    breaks_group: bool = False
    turned: tuple[int, ...] = ()

    def without_point_group(self, why: str) -> MeanField:
        """The same orbitals without labels, and the reason among the warnings."""
        return replace(self, irreps=np.zeros_like(self.irreps), irrep_names=(), warnings=(*self.warnings, why))

    def with_signs_changed(self, orbitals: tuple[int, ...]) -> MeanField:
        """The same orbitals, these with the other sign, in the solver too."""
        signs = np.ones(self.energies.size)
        signs[list(orbitals)] = -1.0
        changed = self.orbitals * signs
        lib = pyscf_module("lib")
        self.solver.mo_coeff = lib.tag_array(changed, orbsym=self.solver.mo_coeff.orbsym) if self.solver.mol.symmetry else changed
        return replace(self, orbitals=changed, turned=tuple(sorted(set(self.turned) ^ set(orbitals))))


def settled(solver: Any, stability: str, iterations: int, warnings: tuple[str, ...], breaks_group: bool = False) -> MeanField:
    """Brings the orbitals into the order and phases that `MeanField` promises, in the solver too."""
    energies, occupation = np.array(solver.mo_energy, dtype=float), np.array(solver.mo_occ, dtype=float)
    orbitals = np.array(solver.mo_coeff, dtype=float)
    labels = np.array(solver.get_orbsym(), dtype=np.int64) if solver.mol.symmetry else np.zeros(energies.size, dtype=np.int64)
    order = np.lexsort((labels, _levels(energies, DEGENERATE), -occupation))
    energies, occupation, labels, orbitals = energies[order], occupation[order], labels[order], orbitals[:, order]
    for block in _blocks(_levels(energies, _SAME_LEVEL), labels, occupation):
        orbitals[:, block] = _turned_to_standard(orbitals[:, block])
    lib, symm = pyscf_module("lib"), pyscf_module("symm")
    grouped = bool(solver.mol.symmetry) and solver.mol.groupname != "C1"
    names = tuple(symm.irrep_id2name(solver.mol.groupname, i) for i in range(_GROUP_ORDER[solver.mol.groupname])) if grouped else ()
    solver.mo_coeff = lib.tag_array(orbitals, orbsym=labels) if solver.mol.symmetry else orbitals
    spin_energies = {n: np.asarray(getattr(solver.mo_energy, n))[order] for n in ("mo_ea", "mo_eb") if hasattr(solver.mo_energy, n)}
    solver.mo_energy = lib.tag_array(energies, **spin_energies) if spin_energies else energies
    solver.mo_occ = occupation
    solver.callback = None
    return MeanField(
        solver=solver,
        energy=float(solver.e_tot),
        orbitals=orbitals,
        energies=energies,
        occupation=occupation,
        irreps=labels,
        irrep_names=names,
        iterations=iterations,
        converged=bool(solver.converged),
        stability=stability,
        warnings=warnings,
        breaks_group=breaks_group,
    )


def _levels(energies: FloatArray, tolerance: float) -> IntArray:
    """Number of the level that each energy belongs to: energies nearer than `tolerance` to the next are one level."""
    order = np.argsort(energies, kind="stable")
    steps = np.concatenate([[0], np.cumsum(np.diff(energies[order]) > tolerance)])
    levels = np.empty(energies.size, dtype=np.int64)
    levels[order] = steps
    return levels


def _blocks(*labels: FloatArray | IntArray) -> list[np.ndarray]:
    """Indices that agree in all labels."""
    _, member = np.unique(np.stack([np.asarray(v, dtype=float) for v in labels]), axis=1, return_inverse=True)
    member = member.ravel()
    return [np.flatnonzero(member == k) for k in range(int(member.max()) + 1)]


def _turned_to_standard(block: FloatArray) -> FloatArray:
    """The orthonormal orbitals (functions, k) of one level turned into a form that does not depend on how they were found.

    Each orbital in turn takes the whole weight of the first basis function on which the rest is large, and is positive there.
    """
    block = block.copy()
    for k in range(block.shape[1]):
        rest = block[:, k:]
        weight = np.linalg.norm(rest, axis=1)
        pivot = int(np.flatnonzero(weight > 0.9 * weight.max())[0])
        direction = rest[pivot] / weight[pivot]
        # Householder: an orthogonal matrix whose first column is `direction`
        v = direction.copy()
        v[0] += 1.0 if v[0] >= 0 else -1.0
        turn = np.eye(v.size) - 2.0 * np.outer(v, v) / (v @ v)
        block[:, k:] = rest @ turn
        if block[pivot, k] < 0:
            block[:, k] *= -1.0
    return block
