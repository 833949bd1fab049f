"""Bars B1 to B6: the sector engine, H psi and whole UCCSD minimisations, against memory bandwidth, openfermion and PySCF.

Hydrogen chains are 1.0 angstrom apart, STO-3G. Every ratio is taken in one run on one thread, both sides in turn, the least of several;
times are processor time of that thread.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from math import comb
from typing import Any

import numpy as np

from thalweg.ansatz.coupled_cluster import UCCSD
from thalweg.ansatz.ground import Ground
from thalweg.circuit.curvature import reference_curvature
from thalweg.circuit.program import ExcitationProgram
from thalweg.circuit.structure import structure_of
from thalweg.errors import Stopped
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.optimize import LBFGSB
from thalweg.simulate.sector import SectorEngine, SectorHamiltonian

Row = dict[str, object]

WATER = "O 0 0 0; H 0 .75812 .63577; H 0 -.75812 .63577"
ATOMS = {
    "LiH": "Li 0 0 0; H 0 0 1.5957",
    "H2O": WATER,
    "BeH2": "Be 0 0 0; H 0 0 1.3264; H 0 0 -1.3264",
    "N2": "N 0 0 0; N 0 0 1.097685",
    "H10": "; ".join(f"H 0 0 {i}" for i in range(10)),
    "H12": "; ".join(f"H 0 0 {i}" for i in range(12)),
}


def b1_forward() -> list[Row]:
    """UCCSD rotations against the time of 32 bytes a pair at the bandwidth of an in-place scale in DRAM; all excitations, no point group."""
    rows = []
    scratch = np.ones(2**26)
    for name in ("H10", "H12"):
        run = Run(name, point_group=False)
        pairs = pair_count(run.program)
        forward, scale = in_turn(run.forward, lambda: np.multiply(scratch, 1.0000001, out=scratch), 3, 6)
        bandwidth = 2 * scratch.nbytes / scale
        bound = pairs * 32 / bandwidth
        text = f"{name}: {pairs:,} pairs in {forward * 1e3:.2f} ms / {bound * 1e3:.2f} ms at {bandwidth / 1e9:.1f} GB/s, at most"
        rows.append(row("B1", text, forward / bound, 1.0, at_least=False))
    return rows


def b2_backward() -> list[Row]:
    """The adjoint sweep against the rotations."""
    rows = []
    for name in ("H10", "H12"):
        run = Run(name, point_group=False)
        forward, both = in_turn(run.forward, run.forward_and_back, 3, 8)
        text = f"{name}: backward {(both - forward) * 1e3:.2f} ms / forward {forward * 1e3:.2f} ms, at most"
        rows.append(row("B2", text, (both - forward) / forward, 2.2, at_least=False))
    return rows


def b3_gradient() -> list[Row]:
    """All 875 derivatives of H10 with the energy, against the energy."""
    run = Run("H10", point_group=False)
    energy, both = in_turn(lambda: run.engine.energy(run.theta), lambda: run.engine.energy_and_gradient(run.theta), 3, 12)
    text = f"H10, {run.program.n_parameters} parameters: energy and gradient {both * 1e3:.2f} ms / energy {energy * 1e3:.2f} ms, at most"
    return [row("B3", text, both / energy, 1.6, at_least=False)]


def b4_against_openfermion() -> list[Row]:
    """H2O: openfermion's sparse operators and scipy's expm_multiply, factor by factor; its gradient by central differences."""
    run = Run("H2O", point_group=True)
    theirs_energy = sparse_energy(run)
    assert abs(theirs_energy(run.theta) - run.engine.energy(run.theta)) < 1e-9
    ours, theirs = in_turn(lambda: run.engine.energy(run.theta), lambda: theirs_energy(run.theta), 200, 1)
    gradient = least(lambda: run.engine.energy_and_gradient(run.theta), 1000)
    differences = 2 * run.program.n_parameters * theirs
    names = f"H2O, {run.program.n_parameters} parameters"
    return [
        row("B4", f"{names}, energy: {theirs * 1e3:.0f} ms / {ours * 1e6:.1f} us, at least", theirs / ours, 2000, at_least=True),
        row(
            "B4", f"{names}, energy and gradient: {differences:.1f} s / {gradient * 1e6:.1f} us, at least", differences / gradient, 1e5, at_least=True
        ),
    ]


def b5_product() -> list[Row]:
    """H psi for any psi against the contract_2e of PySCF's general and symmetry-adapted solvers."""
    rows = []
    for name, symmetric, symmetric_solver, limit, repeats in (
        ("H10", False, False, 1.6, 10),
        ("H10", True, True, 2.3, 10),
        ("N2", True, False, 30.0, 20),
        ("N2", True, True, 1.0, 20),
        ("H12", True, True, 1.0, 1),
    ):
        hamiltonian = molecule(name)
        product = SectorHamiltonian(hamiltonian)
        block = product.block(product.reference_irrep) if symmetric else product.whole
        psi = np.random.default_rng(1).normal(size=block.layout.size)
        out = np.empty_like(psi)
        theirs = contraction(name, block.layout.to_matrix(psi), symmetric_solver)
        assert np.allclose(block.layout.to_matrix(block.apply(psi)), theirs(), atol=1e-8)
        ours_time, theirs_time = in_turn(lambda b=block, v=psi, o=out: b.apply(v, o), theirs, 2 * repeats, repeats)
        kind = "symmetry block" if symmetric else "whole sector"
        solver = "direct_spin1_symm" if symmetric_solver else "direct_spin1"
        text = f"{name}, {kind}: {solver} {theirs_time * 1e3:.2f} ms / {ours_time * 1e3:.3f} ms, at least"
        rows.append(row("B5", text, theirs_time / ours_time, limit, at_least=True))
    return rows


def b6_minimisation() -> list[Row]:
    """Whole UCCSD minimisations to |g| <= 1e-6, engine and H built anew, against PySCF's full CI with the point group on."""
    rows = []
    for name, limit, rounds in (("LiH", 0.5, 8), ("H2O", 0.5, 8), ("BeH2", 0.5, 8), ("N2", 1.0, 6), ("H10", 1.0, 3)):
        rows.append(minimisation(name, limit, rounds))
    return rows


def b6_h12() -> list[Row]:
    """The same for H12: 853,776 determinants."""
    return [minimisation("H12", 1.5, 1)]


class Run:
    """A UCCSD program with an engine and small random angles."""

    def __init__(self, name: str, *, point_group: bool) -> None:
        self.hamiltonian = molecule(name)
        self.program = UCCSD(point_group=point_group).build(Ground(self.hamiltonian, None, 0))
        self.engine = SectorEngine(self.hamiltonian, self.program)
        self.theta = np.random.default_rng(1).normal(0.0, 0.05, self.program.n_parameters)
        self._runner = self.engine._runner
        self._dual = np.random.default_rng(2).normal(size=self.forward().size)
        self._work = self._dual.copy()

    def forward(self) -> np.ndarray:
        return self._runner.forward(self.program.begins, self.theta)

    def forward_and_back(self) -> np.ndarray:
        np.copyto(self._work, self._dual)
        return self._runner.backward(self.forward(), self._work, self.theta)


class Search:
    """The least that an optimiser needs: the energy with its gradient, and the end at |g| <= 1e-6."""

    def __init__(self, hamiltonian: FermionHamiltonian, program: ExcitationProgram) -> None:
        self._engine = SectorEngine(hamiltonian, program)
        self._offset = hamiltonian.reference_energy
        self.n_parameters = program.n_parameters
        self.structure = structure_of(program, 1.0)
        object.__setattr__(self.structure, "curvature", reference_curvature(program, hamiltonian))
        self.evaluations, self.norm = 0, np.inf

    def value_and_gradient(self, parameters: np.ndarray) -> tuple[float, np.ndarray]:
        self.evaluations += 1
        energy, gradient = self._engine.energy_and_gradient(parameters)
        self.norm = float(np.abs(gradient).max())
        return energy - self._offset, gradient

    def iterate(self, parameters: np.ndarray) -> None:
        if self.norm <= 1e-6:
            raise Stopped("gradient")


def minimisation(name: str, limit: float, rounds: int) -> Row:
    hamiltonian = molecule(name)
    program = UCCSD().build(Ground(hamiltonian, None, 0))
    last: list[Search] = []

    def minimise() -> None:
        search = Search(hamiltonian, program)
        last[:] = [search]
        try:
            LBFGSB().minimise(search, np.zeros(program.n_parameters), np.random.default_rng(1))
        except Stopped:
            return

    solver = full_ci(name)
    ours, theirs = in_turn(minimise, solver, 1, 1, rounds=rounds)
    assert last[0].norm <= 1e-6
    what = f"{name}: {program.n_parameters} parameters, {last[0].evaluations} evaluations, {ours * 1e3:.1f} ms"
    return row("B6", f"{what} / full CI {theirs * 1e3:.1f} ms, at most", ours / theirs, limit, at_least=False)


def molecule(name: str) -> FermionHamiltonian:
    from support.hamiltonians import molecule as computed

    hamiltonian: FermionHamiltonian = computed(ATOMS[name])
    return hamiltonian


def mean_field(name: str) -> Any:
    from pyscf import gto, lib, scf

    lib.num_threads(1)
    return scf.RHF(gto.M(atom=ATOMS[name], basis="sto-3g", symmetry=True, verbose=0)).run(conv_tol=1e-12)


def full_ci(name: str) -> Callable[[], Any]:
    from pyscf import fci

    solver = fci.FCI(mean_field(name))
    return solver.kernel


def contraction(name: str, psi: np.ndarray, symmetric: bool) -> Callable[[], np.ndarray]:
    """psi -> H psi without the core energy, by PySCF; on the orbitals of `molecule`."""
    from pyscf import ao2mo, fci, lib

    lib.num_threads(1)
    hamiltonian = molecule(name)
    m, electrons = hamiltonian.n_orbitals, (hamiltonian.sector.n_alpha, hamiltonian.sector.n_beta)
    solver = (fci.direct_spin1_symm if symmetric else fci.direct_spin1).FCI()
    if symmetric:
        solver.orbsym, solver.wfnsym = hamiltonian.orbital_irreps, 0
    integrals = ao2mo.restore(4, hamiltonian.two_body, m)
    effective = solver.absorb_h1e(hamiltonian.one_body, integrals, m, electrons, 0.5)
    links = solver.gen_linkstr(m, electrons)
    return lambda: solver.contract_2e(effective, psi, m, electrons, links)


def sparse_energy(run: Run) -> Callable[[np.ndarray], float]:
    """E(theta) on the register of 2 M qubits: one expm_multiply a factor."""
    import openfermion as of
    from scipy.sparse.linalg import expm_multiply

    hamiltonian, program = run.hamiltonian, run.program
    n = 2 * hamiltonian.n_orbitals
    one, two = of.chem.molecular_data.spinorb_from_spatial(hamiltonian.one_body, hamiltonian.two_body.transpose(0, 2, 3, 1))
    matrix = of.get_sparse_operator(of.InteractionOperator(hamiltonian.core_energy, one, 0.5 * two), n).real
    generators = []
    for e in program.excitations:
        source = [2 * p for p in e.alpha_source] + [2 * p + 1 for p in e.beta_source]
        target = [2 * p for p in e.alpha_target] + [2 * p + 1 for p in e.beta_target]
        ladders = [(p, 1) for p in target] + [(p, 0) for p in reversed(source)]
        alpha = len(e.alpha_source)
        if 0 < alpha < len(source):  # E_alpha E_beta, each with its own order
            ladders = [(target[0], 1), (source[0], 0), (target[1], 1), (source[1], 0)]
        excitation = of.get_sparse_operator(of.FermionOperator(tuple(ladders)), n).real
        generators.append((excitation - excitation.T).tocsr())
    start = np.zeros(1 << n)
    occupied = [2 * p + s for s, mask in enumerate(program.reference) for p in range(hamiltonian.n_orbitals) if mask >> p & 1]
    start[sum(1 << (n - 1 - q) for q in occupied)] = 1.0

    def energy(theta: np.ndarray) -> float:
        psi = start
        for generator, k, factor in zip(generators, program.parameter, program.factor, strict=True):
            psi = expm_multiply(factor * theta[k] * generator, psi)
        return float(psi @ (matrix @ psi))

    return energy


def pair_count(program: ExcitationProgram) -> int:
    """Pairs of amplitudes that a program without point group rotates."""
    sector = program.sector
    total = 0
    for e in program.excitations:
        pairs = 1
        for n, source in ((sector.n_alpha, e.alpha_source), (sector.n_beta, e.beta_source)):
            pairs *= comb(sector.n_orbitals - 2 * len(source), n - len(source))
        total += pairs
    return total


def in_turn(ours: Callable[[], Any], theirs: Callable[[], Any], repeats: int, their_repeats: int, rounds: int = 5) -> tuple[float, float]:
    """Least time of each, seconds, after one call that is not counted."""
    ours()
    theirs()
    found = [(least(ours, repeats), least(theirs, their_repeats)) for _ in range(rounds)]
    return min(a for a, _ in found), min(b for _, b in found)


def least(function: Callable[[], Any], repeats: int) -> float:
    """Least processor time of this thread, seconds: what other programs do on the machine counts less than in time on the wall."""
    found = []
    for _ in range(repeats):
        begun = time.thread_time()
        function()
        found.append(time.thread_time() - begun)
    return min(found)


def row(bar: str, text: str, measured: float, limit: float, *, at_least: bool) -> Row:
    met = measured >= limit if at_least else measured <= limit
    return {"bar": bar, "text": text, "measured": measured, "limit": limit, "met": met}


BARS = [b1_forward, b2_backward, b3_gradient, b4_against_openfermion, b5_product, b6_minimisation, b6_h12]
