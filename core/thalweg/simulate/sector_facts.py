"""What is known of a sector state beside its energy."""

from __future__ import annotations

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.encoding.occupations import occupation_text
from thalweg.kernels.sector_density import spin_density
from thalweg.operators.fermion import Sector
from thalweg.operators.sector_hamiltonian import SymmetryBlock
from thalweg.operators.spin_square import s_squared
from thalweg.simulate.engine import LeadingState, StateFacts
from thalweg.watch import SILENT, Watch

#: How many determinants are listed.
MAX_LEADING = 12


def state_facts(block: SymmetryBlock, sector: Sector, psi: FloatArray, exact_vectors: FloatArray | None, watch: Watch = SILENT) -> StateFacts:
    """Facts of the normalised state `psi` (flat, in the block's layout). exact_vectors: (D, Na, Nb), strings ascending."""
    layout = block.layout
    applied = block.apply(psi, None, watch)
    residual = applied - float(psi @ applied) * psi
    grid = layout.to_grid(psi)
    alpha = spin_density(grid, layout.alpha.strings, block.alpha_singles, sector.n_orbitals)
    beta = spin_density(np.ascontiguousarray(grid.T), layout.beta.strings, block.beta_singles, sector.n_orbitals)
    n_alpha, n_beta = float(np.trace(alpha)), float(np.trace(beta))
    matrix = layout.to_matrix(psi)
    exact = None if exact_vectors is None else np.asarray(exact_vectors).reshape(-1, *matrix.shape)
    return StateFacts(
        n_electrons=n_alpha + n_beta,
        s_z=0.5 * (n_alpha - n_beta),
        s_squared=s_squared(block, sector, psi),
        variance=float(residual @ residual),
        fidelity=None if exact is None else float(np.sum(np.einsum("dab,ab->d", exact, matrix) ** 2)),
        leading=_leading(matrix, sector, exact),
        natural_occupations=tuple(float(v) for v in np.linalg.eigvalsh(alpha + beta)[::-1]),
    )


def _leading(matrix: FloatArray, sector: Sector, exact: FloatArray | None) -> tuple[LeadingState, ...]:
    weights = (matrix**2).ravel()
    count = min(MAX_LEADING, weights.size)
    found = np.argpartition(weights, weights.size - count)[weights.size - count :]
    found = found[np.lexsort((found, -weights[found]))]
    exact_weights = None if exact is None else np.sum(exact.reshape(exact.shape[0], -1)[:, found] ** 2, axis=0)
    states = []
    for rank, index in enumerate(found.tolist()):
        if weights[index] <= 0.0:
            break
        row, column = divmod(index, matrix.shape[1])
        label = occupation_text(_mask(row, sector.n_alpha), _mask(column, sector.n_beta), sector)
        states.append(LeadingState(label, float(weights[index]), None if exact_weights is None else float(exact_weights[rank])))
    return tuple(states)


def _mask(rank: int, n_electrons: int) -> int:
    """The mask with `n_electrons` bits of this ascending rank (combinatorial number system)."""
    from math import comb

    mask = 0
    for k in range(n_electrons, 0, -1):
        p = k - 1
        while comb(p + 1, k) <= rank:
            p += 1
        rank -= comb(p, k)
        mask |= 1 << p
    return mask
