"""What the exact solvers take, estimated from sizes alone before anything is allocated."""

from __future__ import annotations

from thalweg.exact.davidson import SPACE_PER_PAIR
from thalweg.exact.spin_basis import sector_size
from thalweg.exact.spin_search import WORKING_VECTORS
from thalweg.operators.conserved import conserves_parity, conserves_total_spin_along, is_diagonal, is_real
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.operators.pauli import PauliExpansion
from thalweg.operators.product import product_bytes
from thalweg.operators.sector_hamiltonian import estimated_bytes, group_order

#: States that a search for the lowest level and its gap works out in each irrep.
FIRST_STATES = 2
#: Bytes that each basis state takes in the tables of a sector.
STATE_BYTES = 24
#: Vectors that a chain usually has before its state has converged (rings of 16 to 24 spins: 70 to 85).
CHAIN_VECTORS = 85
#: A diagonal Hamiltonian is listed block by block.
DIAGONAL_BYTES = 32 << 18
#: Further vectors for each wanted state while a search space turns: Ritz vectors, residuals, corrections.
TURNING = 4


def determinant_bytes(hamiltonian: FermionHamiltonian, states: int = FIRST_STATES) -> int:
    """Of a search for `states` states in every irrep: H, the states found in all irreps, one search space and its products, one full state."""
    order = group_order(hamiltonian.orbital_irreps)
    dimension = hamiltonian.sector.dimension
    space = (2 * SPACE_PER_PAIR + TURNING) * states * dimension // order
    return estimated_bytes(hamiltonian.sector, order) + 8 * (space + (states + 1) * dimension)


def spin_bytes(expansion: PauliExpansion, budget_bytes: int) -> int:
    """Of a search over the largest sector without translations, which make it smaller.

    The Lanczos chain is kept for the state while it fits half of the budget, and made again beyond.
    """
    if is_diagonal(expansion):
        return DIAGONAL_BYTES
    n, item = expansion.n_qubits, 8 if is_real(expansion) else 16
    keeps_s_z = conserves_total_spin_along(expansion, "z")
    size = sector_size(n, n // 2 if keeps_s_z else None)
    halved = not keeps_s_z and n > 1 and conserves_parity(expansion, "x")
    vector = item * size // (2 if halved else 1)
    register = item << n
    answer = register if register <= budget_bytes // 2 else 0
    tables = STATE_BYTES * size + (0 if keeps_s_z else product_bytes(expansion))
    return tables + WORKING_VECTORS * vector + min(CHAIN_VECTORS * vector, budget_bytes // 2) + answer
