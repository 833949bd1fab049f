"""The engine for number-conserving programs: real amplitudes of one electron sector, kept irrep by irrep."""

from __future__ import annotations

from math import comb

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import Excitation, ExcitationProgram
from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.sector_hamiltonian import SectorHamiltonian, SymmetryBlock, estimated_bytes, group_order
from thalweg.simulate.engine import StateFacts
from thalweg.simulate.sector_facts import state_facts
from thalweg.simulate.sector_pairs import OneSpin
from thalweg.simulate.sector_runner import SectorRunner
from thalweg.simulate.sector_small import SmallRunner
from thalweg.watch import SILENT, Watch

__all__ = ["SectorEngine", "SectorHamiltonian"]

#: Amplitudes times factors up to which one kernel call for the whole program is fastest.
SMALL_WORK = 2_000_000


class SectorEngine:
    """E(theta) and its gradient for one excitation program on one Hamiltonian.

    The point group is used where reference and excitations keep it; otherwise the whole sector is. The gradient comes
    from one backward sweep over psi and H psi: dE/dtheta_k = 2 <H psi|A_k|psi> with both undone factor by factor.
    """

    def __init__(
        self,
        hamiltonian: FermionHamiltonian,
        program: ExcitationProgram,
        product: SectorHamiltonian | None = None,
        *,
        budget_bytes: int | None = None,
        watch: Watch = SILENT,
    ) -> None:
        """`product` shares H between engines; StudyError where the estimate is past `budget_bytes`."""
        self._hamiltonian, self._program, self.watch = hamiltonian, program, watch
        self._bytes = engine_bytes(hamiltonian, program)
        if budget_bytes is not None and self._bytes > budget_bytes:
            raise _over_budget(hamiltonian, self._bytes)
        self._product = SectorHamiltonian(hamiltonian) if product is None else product
        self.n_parameters, self._begins = program.n_parameters, program.begins
        live = [f for f, e in enumerate(program.excitations) if not _is_null(e)]
        excitations = [program.excitations[f] for f in live]
        self._parameter = np.asarray(program.parameter, np.int64)[live]
        self._factor = np.asarray(program.factor, float)[live]
        symmetric = keeps_point_group(program, hamiltonian.orbital_irreps)
        self._block: SymmetryBlock = self._product.block(self._product.reference_irrep) if symmetric else self._product.whole
        layout = self._block.layout
        self._dual = np.empty(layout.size)
        small = layout.size * len(excitations) <= SMALL_WORK
        self._runner = SmallRunner(excitations, layout) if small else SectorRunner(excitations, layout)

    def energy(self, parameters: FloatArray) -> float:
        psi = self._forward(parameters)
        return self._hamiltonian.core_energy + float(psi @ self._block.apply(psi, self._dual, self.watch))

    def energy_and_gradient(self, parameters: FloatArray) -> tuple[float, FloatArray]:
        angles = self._angles(parameters)
        psi = self._runner.forward(self._begins, angles, self.watch)
        dual = self._block.apply(psi, self._dual, self.watch)
        energy = self._hamiltonian.core_energy + float(psi @ dual)
        slopes = self._runner.backward(psi, dual, angles, self.watch)
        gradient = np.bincount(self._parameter, weights=slopes * self._factor, minlength=self.n_parameters)
        return energy, gradient.astype(float)

    def state(self, parameters: FloatArray) -> FloatArray:
        """Amplitudes (alpha, beta), strings ascending."""
        return self._block.layout.to_matrix(self._forward(parameters))

    def facts(self, parameters: FloatArray, exact_vectors: FloatArray | None) -> StateFacts:
        return state_facts(self._block, self._program.sector, self._forward(parameters).copy(), exact_vectors, self.watch)

    def memory_bytes(self) -> int:
        return self._bytes

    def _angles(self, parameters: FloatArray) -> FloatArray:
        angles: FloatArray = self._factor * np.asarray(parameters, float)[self._parameter]
        return angles

    def _forward(self, parameters: FloatArray) -> FloatArray:
        return self._runner.forward(self._begins, self._angles(parameters), self.watch)


def engine_bytes(hamiltonian: FermionHamiltonian, program: ExcitationProgram) -> int:
    """Estimate, from sizes alone, of what an engine and its share of H take, bytes."""
    sector = program.sector
    symmetric = keeps_point_group(program, hamiltonian.orbital_irreps)
    order = group_order(hamiltonian.orbital_irreps) if symmetric else 1
    alpha = {(e.alpha_source, e.alpha_target) for e in program.excitations}
    beta = {(e.beta_source, e.beta_target) for e in program.excitations}
    pairs = _pair_count(sector.n_orbitals, sector.n_alpha, alpha) + _pair_count(sector.n_orbitals, sector.n_beta, beta)
    return estimated_bytes(sector, order, blocks=1) + 24 * pairs + 5 * 8 * sector.dimension // order


def _pair_count(n_orbitals: int, n_electrons: int, excitations: set[OneSpin]) -> int:
    """Pairs of strings in all these excitations, orbitals in common left out of account."""
    ranks = [len(source) for source, _ in excitations]
    return sum(comb(max(n_orbitals - 2 * r, 0), n_electrons - r) for r in ranks if n_electrons >= r)


def _over_budget(hamiltonian: FermionHamiltonian, needed: int) -> StudyError:
    return StudyError(
        "The trial state does not fit the memory budget",
        f"{hamiltonian.sector} make {hamiltonian.sector.dimension:,} determinants, which need about {needed / 2**30:.3g} GiB",
        "Choose a smaller active space or raise the memory budget",
        "memory_gib",
    )


def keeps_point_group(program: ExcitationProgram, orbital_irreps: IntArray) -> bool:
    """True when every excitation is totally symmetric."""
    labels = np.asarray(orbital_irreps).tolist()
    for e in program.excitations:
        product = 0
        for p in (*e.alpha_source, *e.alpha_target, *e.beta_source, *e.beta_target):
            product ^= labels[p]
        if product:
            return False
    return True


def _is_null(e: Excitation) -> bool:
    """T - T+ vanishes where T only counts electrons."""
    return e.alpha_source == e.alpha_target and e.beta_source == e.beta_target
