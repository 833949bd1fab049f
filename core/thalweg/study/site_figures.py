"""What a state looks like on its lattice: magnetisation, spin correlations, structure factor, double occupancy."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from thalweg.arrays import FloatArray, plain
from thalweg.exact.answer import ExactAnswer
from thalweg.study.problem import Problem, Recent
from thalweg.study.result import SiteFigures
from thalweg.systems.hubbard import Hubbard
from thalweg.systems.lattice_graph import LatticeGraph
from thalweg.systems.lattice_model import LatticeModel
from thalweg.watch import SILENT, Watch

#: Larger registers would take minutes for all pairs of sites.
MAX_SITES = 20
#: Momenta of the structure factor up to this length, in units of 1 / nearest distance.
LONGEST_MOMENTUM = 2 * np.pi + 1e-6

_exact = Recent(2)


def has_site_figures(problem: Problem) -> bool:
    """Whether the states of this study can be looked at site by site: a lattice that is not too large, its sites on the whole register."""
    system = problem.spec.system
    if not isinstance(system, LatticeModel):
        return False
    if isinstance(system.model, Hubbard):
        return system.graph().n_sites <= MAX_SITES
    qubits = problem.encoded.full.n_qubits
    return problem.encoded.working.n_qubits == qubits == system.graph().n_sites and qubits <= MAX_SITES


def exact_site_figures(problem: Problem, exact: ExactAnswer | None, watch: Watch = SILENT) -> SiteFigures | None:
    """Those of the whole exact level, kept for the next run of this system; None where there are none. Raises Stopped when asked to stop."""
    if exact is None or exact.vectors is None or not has_site_figures(problem):
        return None

    def work_out() -> tuple[ExactAnswer, SiteFigures | None]:
        watch.stage("Correlations of the exact state")
        return exact, site_figures(problem, exact.vectors, watch)

    found: SiteFigures | None = _exact.get((id(exact), problem.spec.system), work_out)[1]
    return found


def site_figures(problem: Problem, vectors: Any, watch: Watch = SILENT) -> SiteFigures | None:
    """Figures of a state, or averaged over an orthonormal set of states, first axis; None where there are none or they cannot be had.

    Spin systems take register amplitudes (states, 2^n) of the untapered register, Hubbard systems sector amplitudes (states, Na, Nb).
    """
    system = problem.spec.system
    if not has_site_figures(problem) or not isinstance(system, LatticeModel) or vectors is None or len(vectors) == 0:
        return None
    if isinstance(system.model, Hubbard):
        in_sector = np.ndim(vectors) == 3  # a circuit of electrons on the register has no such amplitudes
        return _electron_figures(problem, system.model, system.graph(), np.asarray(vectors), watch) if in_sector else None
    return _spin_figures(system.graph(), np.asarray(vectors), watch)


def _spin_figures(graph: LatticeGraph, vectors: np.ndarray, watch: Watch) -> SiteFigures:
    from thalweg.kernels.site_figures import pair_swaps, z_moments

    n = graph.n_sites
    single, double, spin = np.zeros(n), np.zeros((n, n)), np.zeros((n, n))
    for vector in vectors:
        real, imag = np.ascontiguousarray(vector.real, dtype=float), np.ascontiguousarray(vector.imag, dtype=float)
        one, two = z_moments(real**2 + imag**2, n)
        single += one / len(vectors)
        double += two / len(vectors)
        for i in range(n):
            watch.check()
            for j in range(i + 1, n):
                spin[i, j] += (0.5 * pair_swaps(real, imag, i, j) - 0.25) / len(vectors)  # S_i.S_j = P_ij / 2 - 1/4
    spin = spin + spin.T + 0.75 * np.eye(n)
    return SiteFigures(
        magnetisation=plain(0.5 * single),
        z_correlations=tuple(plain(row) for row in 0.25 * double),
        spin_correlations=tuple(plain(row) for row in spin),
        structure_factor=structure_factor(graph, spin),
    )


def structure_factor(graph: LatticeGraph, spin: FloatArray) -> tuple[tuple[float, float, float], ...]:
    """(k_x, k_y, S(k)) with S(k) = 1/N sum_ij exp(i k.(r_i - r_j)) <S_i.S_j>, at the momenta of the torus (of its extent where open)."""
    found = []
    places = graph.coordinates
    for k in _momenta(graph):
        phase = np.exp(1j * places @ k)
        found.append((float(k[0]), float(k[1]), float((phase.conj() @ spin @ phase).real / graph.n_sites)))
    return tuple(found)


def _momenta(graph: LatticeGraph) -> list[FloatArray]:
    """Reciprocal vectors of the repeats, one of each pair k and -k, shortest first."""
    repeats = [row for row in np.asarray(graph.torus, dtype=float) if np.linalg.norm(row) > 1e-9]
    if not repeats:
        extent = np.ptp(graph.coordinates, axis=0) + 1.0
        repeats = [np.array([extent[0], 0.0])] + ([np.array([0.0, extent[1]])] if extent[1] > 1.5 else [])
    steps = 2 * np.pi * np.linalg.pinv(np.array(repeats)).T
    reach = [int(np.ceil(LONGEST_MOMENTUM * np.linalg.norm(r) / (2 * np.pi))) for r in repeats]
    grid = np.array(np.meshgrid(*[np.arange(-m, m + 1) for m in reach], indexing="ij")).reshape(len(repeats), -1).T
    all_k = [np.asarray(g @ steps) for g in grid]
    kept = [k for k in all_k if np.linalg.norm(k) <= LONGEST_MOMENTUM and (k[0] > 1e-9 or (abs(k[0]) <= 1e-9 and k[1] > -1e-9))]
    return sorted(kept, key=lambda k: (round(float(np.linalg.norm(k)), 9), round(float(k[0]), 9), round(float(k[1]), 9)))


def _electron_figures(problem: Problem, model: Hubbard, graph: LatticeGraph, vectors: np.ndarray, watch: Watch) -> SiteFigures:
    """Double occupancy of each site, as the expectation of n_up n_down in the orbitals of the Hamiltonian."""
    from thalweg.operators.sector_hamiltonian import SectorHamiltonian

    fermions = problem.prepared.fermions
    assert fermions is not None
    orbitals = model.orbital_coefficients(graph)
    n = graph.n_sites
    occupancy = np.zeros(n)
    for site in range(n):
        watch.check()
        row = orbitals[site]
        fourfold = np.einsum("p,q,r,s->pqrs", row, row, row, row)
        pair = replace(fermions, core_energy=0.0, one_body=np.zeros((n, n)), two_body=fourfold)
        block = SectorHamiltonian(pair).whole
        states = [block.layout.from_matrix(np.asarray(vector, dtype=float)) for vector in vectors]
        occupancy[site] = np.mean([state @ block.apply(state) for state in states])
    return SiteFigures(double_occupancy=plain(occupancy))
