"""Restricted Hartree-Fock by PySCF: solved, made stable, and brought into an order that depends on the settings alone.

PySCF is imported inside functions: the window's process never loads it, and Windows has none.
"""

from __future__ import annotations

import os
import re
import warnings
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.errors import StudyError
from thalweg.systems.active_space import DEGENERATE
from thalweg.watch import Watch

_CONVERGED_ENERGY = 1e-11  # Eh
_CONVERGED_GRADIENT = 1e-7
_MAX_CYCLES = 100
_MAX_FOLLOWED = 4
#: An instability is followed only to a solution lower than this, Eh.
_LOWER = 1e-8
#: Orbital energies nearer than this are one level whose orbitals may be turned into each other, Eh.
_SAME_LEVEL = 1e-7


@dataclass
class MeanField:
    """Orbitals in their final order: doubly occupied, singly occupied, empty; by energy, then by irrep.

    Attributes:
        solver: the PySCF object, holding these orbitals.
        energy: Eh, nuclear repulsion included.
        orbitals: shape (functions, orbitals).
        energies, occupation: shape (orbitals,), Eh; 2, 1 or 0.
        irreps: labels whose product is the bitwise xor, shape (orbitals,); all 0 without a point group.
        irrep_names: name of each label, empty without a point group.
        row_names: irrep of each orbital in the full group, for people.
        iterations: of all solutions together.
    """

    solver: Any
    energy: float
    orbitals: FloatArray
    energies: FloatArray
    occupation: FloatArray
    irreps: IntArray
    irrep_names: tuple[str, ...]
    row_names: tuple[str, ...]
    iterations: int
    converged: bool
    stability: str
    warnings: tuple[str, ...]


@dataclass
class _Progress:
    """What happened on the way to the solution."""

    watch: Watch
    iterations: int = 0
    remarks: list[str] = field(default_factory=list)

    def step(self, variables: dict[str, Any]) -> None:
        self.iterations += 1
        self.watch.check()


def build_mole(
    symbols: Sequence[str], xyz: FloatArray, basis: str, charge: int, n_unpaired: int, cartesian: bool, point_group: bool, budget_bytes: int
) -> Any:
    """The PySCF molecule; `xyz` in bohr, shape (atoms, 3). Raises StudyError for an unknown basis or missing PySCF."""
    gto = _pyscf_module("gto")
    _check_basis(gto, basis, symbols)
    mole = gto.Mole(verbose=0, max_memory=budget_bytes / 1e6, incore_anyway=True)
    # A single atom is treated in D2h: the full rotation group has no labels that compose by xor.
    symmetry: bool | str = "D2h" if point_group and len(symbols) == 1 else point_group
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        mole.build(
            dump_input=False,
            parse_arg=False,
            atom=[(s, tuple(r)) for s, r in zip(symbols, xyz.tolist(), strict=True)],
            unit="Bohr",
            basis=basis,
            ecp={s: basis for s in set(symbols) if _has_core_potential(gto, basis, s)},
            charge=charge,
            spin=n_unpaired,
            cart=cartesian,
            symmetry=symmetry,
        )
    return mole


def solve(mole: Any, watch: Watch, seed: FloatArray | None = None) -> MeanField:
    """RHF or ROHF from PySCF's atomic guess or from the density matrix `seed`, shape (functions, functions) or (2, ...)."""
    lib = _pyscf_module("lib")
    progress = _Progress(watch)
    # One thread: sums of several threads come in any order, and the same settings must give the same numbers.
    with lib.with_omp_threads(1), warnings.catch_warnings():
        warnings.simplefilter("ignore")
        solver = _first_solution(mole, progress, seed)
        stability = _make_stable(solver, progress)
        _check_broken_symmetry(solver, progress)
        return _settled(solver, progress, stability)


def _pyscf_module(name: str) -> Any:
    try:
        import importlib

        return importlib.import_module(f"pyscf.{name}")
    except ImportError:
        raise StudyError(
            "A geometry cannot be computed here",
            "the library PySCF, which computes mean fields and integrals, is not installed (there is none for Windows)",
            "Load an FCIDUMP or HDF5 file with the integrals instead, or use Linux or macOS",
            "system",
        ) from None


def _check_basis(gto: Any, basis: str, symbols: Sequence[str]) -> None:
    unknown = StudyError(
        f"Unknown basis set '{basis[:40]}'",
        "PySCF has none of this name",
        "Use a name from the literature, e.g. sto-3g, 6-31g*, cc-pvdz",
        "system.basis",
    )
    # PySCF would read a file of this name or an inline listing: a session must run again without either.
    if not re.fullmatch(r"[\w+*(),.@ -]{1,60}", basis) or os.path.isfile(basis) or basis.lower().startswith("gth"):
        raise unknown
    missing = [s for s in dict.fromkeys(symbols) if not _has_basis(gto, basis, s)]
    if not missing:
        return
    if not any(_has_basis(gto, basis, s) for s in ("H", "C", "Na", "Fe", "I")):
        raise unknown
    raise StudyError(f"The basis set '{basis}' has no functions for {missing[0]}", "it does not cover this element", "Choose another", "system.basis")


def _has_basis(gto: Any, basis: str, symbol: str) -> bool:
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            return bool(gto.basis.load(basis, symbol))
    except Exception:  # PySCF raises half a dozen types for a name that it cannot read
        return False


def _has_core_potential(gto: Any, basis: str, symbol: str) -> bool:
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            return bool(gto.basis.load_ecp(basis, symbol))
    except Exception:  # as above: most basis sets have none
        return False


def _first_solution(mole: Any, progress: _Progress, seed: FloatArray | None) -> Any:
    scf = _pyscf_module("scf")
    solver = scf.ROHF(mole) if mole.spin else scf.RHF(mole)
    solver.verbose, solver.chkfile = 0, None
    solver.max_cycle, solver.conv_tol, solver.conv_tol_grad = _MAX_CYCLES, _CONVERGED_ENERGY, _CONVERGED_GRADIENT
    solver.callback = progress.step
    solver.kernel(seed)
    if not solver.converged:
        _second_order(solver, solver.mo_coeff, progress)
        if solver.converged:
            progress.remarks.append(f"The mean field did not converge in {_MAX_CYCLES} iterations and was finished by the second-order method")
        else:
            progress.remarks.append(
                "The mean field did not converge, not even by the second-order method: the orbitals are not Hartree-Fock orbitals"
            )
    return solver


def _second_order(solver: Any, orbitals: FloatArray, progress: _Progress) -> None:
    """Newton's method from these orbitals; the solution replaces that of `solver`."""
    newton = solver.newton()
    newton.verbose, newton.max_cycle, newton.callback = 0, 50, progress.step
    newton.kernel(orbitals, solver.mo_occ)
    for name in ("mo_coeff", "mo_energy", "mo_occ", "e_tot", "converged"):
        setattr(solver, name, getattr(newton, name))


def _has_rotations(solver: Any) -> bool:
    return solver.mol.nelectron > 1 and len(set(np.asarray(solver.mo_occ).tolist())) > 1


def _lowest_rotation(solver: Any, with_symmetry: bool) -> FloatArray | None:
    """Orbitals turned along the lowest internal instability; None when there is none."""
    stability = _pyscf_module("scf.stability")
    check = stability.rohf_internal if solver.mol.spin else stability.rhf_internal
    try:
        orbitals, stable = check(solver, with_symmetry=with_symmetry, return_status=True)
    except (ZeroDivisionError, RuntimeError, np.linalg.LinAlgError):
        return None  # raised when symmetry leaves no rotation to look at
    return None if stable else orbitals


def _make_stable(solver: Any, progress: _Progress) -> str:
    """Follows internal instabilities that keep the point group; returns what was found."""
    if not _has_rotations(solver):
        return "no orbital rotations"
    start = float(solver.e_tot)
    for _ in range(_MAX_FOLLOWED):
        progress.watch.check()
        orbitals = _lowest_rotation(solver, with_symmetry=True)
        if orbitals is None:
            break
        before = (solver.mo_coeff, solver.mo_energy, solver.mo_occ, solver.e_tot, solver.converged)
        _second_order(solver, orbitals, progress)
        if solver.e_tot > before[3] - _LOWER:
            solver.mo_coeff, solver.mo_energy, solver.mo_occ, solver.e_tot, solver.converged = before
            progress.remarks.append("The mean field is unstable and no lower solution was found")
            return "unstable"
    fall = start - float(solver.e_tot)
    if fall > _LOWER:
        progress.remarks.append(f"The first mean field was unstable; a solution {1e3 * fall:.3f} mEh lower was followed")
        return "stable after following an instability"
    return "stable"


def _check_broken_symmetry(solver: Any, progress: _Progress) -> None:
    """Looks for a lower solution outside the point group: takes its occupation if that fits the group, else says so."""
    if not solver.mol.symmetry or not _has_rotations(solver):
        return
    orbitals = _lowest_rotation(solver, with_symmetry=False)
    if orbitals is None:
        return
    scf = _pyscf_module("scf")
    plain = solver.mol.copy()
    plain.symmetry = False
    plain.build(dump_input=False, parse_arg=False)
    broken = scf.ROHF(plain) if plain.spin else scf.RHF(plain)
    broken.verbose, broken.chkfile = 0, None
    broken.conv_tol, broken.conv_tol_grad, broken._eri = _CONVERGED_ENERGY, _CONVERGED_GRADIENT, solver._eri
    broken.mo_occ = solver.mo_occ
    _second_order(broken, np.asarray(orbitals), progress)
    fall = float(solver.e_tot - broken.e_tot)
    if fall > 1e-6:
        progress.remarks.append(
            f"A mean field {1e3 * fall:.3f} mEh lower breaks the point group {solver.mol.groupname}: switch the point group off to start from it"
        )


def _settled(solver: Any, progress: _Progress, stability: str) -> MeanField:
    """Brings the orbitals into the order and phases that `MeanField` promises, in the solver too."""
    energies, occupation = np.array(solver.mo_energy, dtype=float), np.array(solver.mo_occ, dtype=float)
    orbitals = np.array(solver.mo_coeff, dtype=float)
    full = np.array(solver.get_orbsym(), dtype=np.int64) if solver.mol.symmetry else np.zeros(energies.size, dtype=np.int64)
    order = np.lexsort((full, _levels(energies, DEGENERATE), -occupation))
    energies, occupation, full, orbitals = energies[order], occupation[order], full[order], orbitals[:, order]
    for block in _blocks(_levels(energies, _SAME_LEVEL), full, occupation):
        orbitals[:, block] = _turned_to_standard(orbitals[:, block])
    lib, symm = _pyscf_module("lib"), _pyscf_module("symm")
    grouped = bool(solver.mol.symmetry) and solver.mol.groupname != "C1"
    abelian = {"Dooh": "D2h", "Coov": "C2v"}.get(solver.mol.groupname, solver.mol.groupname)
    irreps = full % 10 if grouped else np.zeros_like(full)
    names = [n.replace("Dooh", "") for n in (symm.irrep_id2name(solver.mol.groupname, int(i)) for i in full)] if grouped else [""] * full.size
    count = {"D2h": 8, "C2v": 4, "C2h": 4, "D2": 4}.get(abelian, 2)
    solver.mo_coeff = lib.tag_array(orbitals, orbsym=full) if solver.mol.symmetry else orbitals
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
        irreps=irreps,
        irrep_names=tuple(symm.irrep_id2name(abelian, i) for i in range(count)) if grouped else (),
        row_names=tuple(names),
        iterations=progress.iterations,
        converged=bool(solver.converged),
        stability=stability,
        warnings=tuple(progress.remarks),
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
