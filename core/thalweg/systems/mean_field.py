"""Restricted Hartree-Fock by PySCF: solved, made stable, and brought into an order that depends on the settings alone.

PySCF is imported inside functions: the window's process never loads it, and Windows has none.
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.systems.gaussian_basis import pyscf_module, with_turned_axes
from thalweg.systems.orbital_order import MeanField, settled
from thalweg.systems.prepared import MeanFieldSeed
from thalweg.watch import Watch

_CONVERGED_ENERGY = 1e-11  # Eh
_CONVERGED_GRADIENT = 1e-7
_MAX_CYCLES = 100
_MAX_FOLLOWED = 4
#: A solution outside the point group is spoken of only when it is lower by more than this, Eh.
_WORTH_TELLING = 1e-6
#: An instability is followed only to a solution lower than this, Eh.
_LOWER = 1e-8


@dataclass
class _Progress:
    """What happened on the way to the solution."""

    watch: Watch
    iterations: int = 0
    remarks: list[str] = field(default_factory=list)

    def step(self, variables: dict[str, Any]) -> None:
        self.iterations += 1
        self.watch.check()


def solve(mole: Any, watch: Watch, density: FloatArray | None = None, seed: MeanFieldSeed | None = None) -> MeanField:
    """RHF or ROHF from PySCF's atomic guess or from a density matrix, shape (functions, functions) or (2, ...).

    `seed` says what was found at the geometry that the density comes from: its own, whose stability is then known, or a neighbour.
    """
    lib = pyscf_module("lib")
    progress = _Progress(watch)
    # One thread: sums of several threads come in any order, and the same settings must give the same numbers.
    with lib.with_omp_threads(1), warnings.catch_warnings():
        warnings.simplefilter("ignore")
        solver = _first_solution(mole, progress, density)
        if seed is not None and seed.here and abs(float(solver.e_tot) - seed.energy) < _LOWER:
            return settled(solver, seed.stability, progress.iterations, seed.warnings, seed.breaks_group)
        if _is_stable_at_once(solver, progress):
            return settled(solver, "stable", progress.iterations, tuple(progress.remarks))
        stability = _make_stable(solver, progress)
        breaks_group = False
        if solver.mol.symmetry and _has_rotations(solver):
            solver, breaks_group = _checked_for_broken_symmetry(solver, progress, seed is not None and seed.breaks_group)
        return settled(solver, stability, progress.iterations, tuple(progress.remarks), breaks_group)


def _first_solution(mole: Any, progress: _Progress, seed: FloatArray | None) -> Any:
    solver = _new_solver(mole, progress)
    solver.kernel(seed)
    if not solver.converged:
        _rescue(solver, progress)
    return solver


def _new_solver(mole: Any, progress: _Progress) -> Any:
    scf = pyscf_module("scf")
    solver = scf.ROHF(mole) if mole.spin else scf.RHF(mole)
    solver.verbose, solver.chkfile = 0, None
    solver.max_cycle, solver.conv_tol, solver.conv_tol_grad = _MAX_CYCLES, _CONVERGED_ENERGY, _CONVERGED_GRADIENT
    solver.callback = progress.step
    one_body, overlap = solver.get_hcore(), solver.get_ovlp()
    solver.get_hcore, solver.get_ovlp = lambda *_: one_body, lambda *_: overlap  # PySCF works them out anew at every call
    return solver


def _rescue(solver: Any, progress: _Progress) -> None:
    """What is tried when the iterations do not converge: the second-order method, with the electrons of each irrep held fixed.

    Degenerate open shells make the plain iterations swap the components of the shell without end.
    """
    if solver.mol.symmetry:
        solver.irrep_nelec = solver.get_irrep_nelec()
        solver.kernel(solver.make_rdm1())
    if not solver.converged:
        _second_order(solver, solver.mo_coeff, progress)
    if solver.converged:
        progress.remarks.append(f"The mean field did not converge in {_MAX_CYCLES} iterations and was finished by other means")
    else:
        progress.remarks.append("The mean field did not converge, not even by the second-order method: the orbitals are not Hartree-Fock orbitals")


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
    stability = pyscf_module("scf.stability")
    check = stability.rohf_internal if solver.mol.spin else stability.rhf_internal
    try:
        orbitals, stable = check(solver, with_symmetry=with_symmetry, return_status=True)
    except (ZeroDivisionError, RuntimeError, np.linalg.LinAlgError):
        return None  # raised when symmetry leaves no rotation to look at
    return None if stable else orbitals


def _is_stable_at_once(solver: Any, progress: _Progress) -> bool:
    """Whether one look at all rotations, those outside the point group included, finds no instability: then there is nothing to follow."""
    progress.watch.check()
    return bool(solver.mol.symmetry) and _has_rotations(solver) and _lowest_rotation(solver, with_symmetry=False) is None


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


def _checked_for_broken_symmetry(solver: Any, progress: _Progress, expected: bool) -> tuple[Any, bool]:
    """Looks for a lower solution outside the point group. One that fits the group with its axes turned is taken; another is only told of.

    Returns the solver, and whether such another one was told of. Where it is `expected`, because a neighbouring geometry has one, the
    instability is enough and the solution itself is not worked out.
    """
    orbitals = _lowest_rotation(solver, with_symmetry=False)
    if orbitals is None:
        return solver, False
    group, remedy = solver.mol.groupname, "switch the point group off to start from it"
    if expected:
        progress.remarks.append(f"A lower mean field breaks the point group {group}, as at the neighbouring geometry: {remedy}")
        return solver, True
    plain = solver.mol.copy()
    plain.symmetry = False
    broken = _new_solver(plain, progress)
    broken._eri, broken.mo_occ = solver._eri, solver.mo_occ
    _second_order(broken, np.asarray(orbitals), progress)
    if broken.e_tot > solver.e_tot - _WORTH_TELLING:
        return solver, False
    turned = _solved_with_turned_axes(solver, broken.make_rdm1(), progress)
    if turned is not None:
        solver = turned
    fall = float(solver.e_tot - broken.e_tot)
    if fall <= _WORTH_TELLING:
        return solver, False
    progress.remarks.append(f"A mean field {1e3 * fall:.3f} mEh lower breaks the point group {group}: {remedy}")
    return solver, turned is None


def _solved_with_turned_axes(solver: Any, seed: FloatArray, progress: _Progress) -> Any | None:
    """The solution in the same Abelian group turned by 45 degrees about z, if the molecule allows that and it is lower; else None.

    A fourfold axis (D4h, C4v, D4) leaves two choices of the twofold axes, and degenerate shells may be filled along either.
    """
    turned_mole = with_turned_axes(solver.mol)
    if turned_mole is None:
        return None
    turned = _new_solver(turned_mole, progress)
    turned._eri = solver._eri
    turned.kernel(seed)
    if not turned.converged or turned.e_tot > solver.e_tot - _WORTH_TELLING or _lowest_rotation(turned, with_symmetry=True) is not None:
        return None
    return turned
