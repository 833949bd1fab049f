"""Reference figures of classical methods on the same integrals: MP2, CCSD and CCSD(T), by PySCF."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from thalweg.operators.fermion import FermionHamiltonian
from thalweg.watch import SILENT, Watch

NAMES = {"mp2": "MP2", "ccsd": "CCSD", "ccsd(t)": "CCSD(T)"}


def classical_energies(
    hamiltonian: FermionHamiltonian, methods: tuple[str, ...], watch: Watch = SILENT
) -> tuple[dict[str, float | None], tuple[str, ...]]:
    """Total energies (Eh, core included) by method key, None where there is none; and sentences that say why.

    A mean field is built on the orthonormal orbitals of the integrals: restricted for equal numbers of electrons,
    restricted open-shell (with unrestricted coupled cluster on its orbitals) otherwise.
    """
    energies: dict[str, float | None] = dict.fromkeys(methods)
    remarks: list[str] = []
    if hamiltonian.sector.n_electrons == 0:
        return energies, ("Classical methods need at least one electron.",)
    if hamiltonian.sector.n_electrons == 1:  # nothing to correlate
        alone = hamiltonian.core_energy + float(np.linalg.eigvalsh(hamiltonian.one_body)[0])
        return dict.fromkeys(methods, alone), ()
    watch.stage("Mean field for the classical methods")
    field = _mean_field(hamiltonian, watch)
    if not field.converged:
        return energies, ("Classical methods were left out: the mean field on the active orbitals did not converge.",)
    shared = _CoupledCluster(field, hamiltonian, watch)
    for method in methods:
        watch.stage(NAMES[method])
        solve: dict[str, Callable[[], tuple[float | None, str]]] = {"mp2": shared.mp2, "ccsd": shared.ccsd, "ccsd(t)": shared.ccsd_t}
        energies[method], remark = solve[method]()
        if remark:
            remarks.append(remark)
    return energies, tuple(dict.fromkeys(remarks))


class _CoupledCluster:
    """Runs CCSD once for both figures that rest on it."""

    def __init__(self, field: Any, hamiltonian: FermionHamiltonian, watch: Watch) -> None:
        self._field, self._watch = field, watch
        self._sector = sector = hamiltonian.sector
        self._trivial = sector.n_alpha == sector.n_orbitals == sector.n_beta
        self._solver: Any = None

    def mp2(self) -> tuple[float | None, str]:
        if self._trivial:
            return float(self._field.e_tot), ""
        from pyscf import mp

        solver = mp.MP2(self._field) if self._closed else mp.UMP2(self._unrestricted)
        with np.errstate(divide="ignore", invalid="ignore"):
            solver.kernel()
        energy = float(solver.e_tot)
        return (energy, "") if np.isfinite(energy) else (None, "MP2 has no finite value: two orbital energies coincide.")

    def ccsd(self) -> tuple[float | None, str]:
        if self._trivial:
            return float(self._field.e_tot), ""
        solver = self._solved()
        return (float(solver.e_tot), "") if solver.converged else (None, "CCSD did not converge, so it and CCSD(T) have no figure.")

    def ccsd_t(self) -> tuple[float | None, str]:
        energy, remark = self.ccsd()
        if energy is None or self._trivial:
            return energy, remark
        sector = self._sector
        if sector.n_electrons < 3 or 2 * sector.n_orbitals - sector.n_electrons < 3:
            return energy, ""  # no triple excitation exists
        if sector.n_orbitals in (sector.n_alpha, sector.n_beta):
            return None, "CCSD(T) has no figure where one spin has no empty orbital."
        return energy + float(self._solved().ccsd_t()), ""

    @property
    def _closed(self) -> bool:
        return bool(self._field.mol.spin == 0)

    @property
    def _unrestricted(self) -> Any:
        return self._field.to_uhf()

    def _solved(self) -> Any:
        if self._solver is None:
            from pyscf import cc

            self._solver = cc.CCSD(self._field) if self._closed else cc.UCCSD(self._unrestricted)
            self._solver.set(verbose=0, conv_tol=1e-9, max_cycle=200, callback=lambda values: self._watch.check())
            self._solver.kernel()
        return self._solver


def _mean_field(hamiltonian: FermionHamiltonian, watch: Watch) -> Any:
    """A PySCF mean field whose basis is the orbitals of the integrals, started from the reference determinant."""
    from pyscf import ao2mo, gto, scf

    sector, m = hamiltonian.sector, hamiltonian.n_orbitals
    molecule = gto.M(verbose=0)
    molecule.nelectron, molecule.spin, molecule.incore_anyway = sector.n_electrons, sector.n_alpha - sector.n_beta, True
    molecule.nao = m
    field = scf.RHF(molecule) if molecule.spin == 0 else scf.ROHF(molecule)
    field.get_hcore = lambda *_: np.asarray(hamiltonian.one_body)
    field.get_ovlp = lambda *_: np.eye(m)
    field.energy_nuc = lambda *_: hamiltonian.core_energy
    field._eri = ao2mo.restore(8, np.asarray(hamiltonian.two_body), m)
    field.set(verbose=0, conv_tol=1e-12, max_cycle=200, callback=lambda values: watch.check())
    densities = [np.diag([float(mask >> p & 1) for p in range(m)]) for mask in hamiltonian.reference]
    field.kernel(densities[0] + densities[1] if molecule.spin == 0 else np.array(densities))
    return field
