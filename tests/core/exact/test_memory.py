"""Memory of the exact solvers: estimated before it is taken, near what is taken, and refused with the figure past the budget."""

from __future__ import annotations

import tracemalloc

import pytest
from support.hamiltonians import chain, molecule

from thalweg.errors import StudyError
from thalweg.exact.determinant import lowest_level, lowest_levels
from thalweg.exact.memory import determinant_bytes, spin_bytes
from thalweg.exact.spin_sector import lowest_level_spins
from thalweg.systems.lattice import Chain
from thalweg.systems.spin_models import Heisenberg, Ising
from thalweg.watch import SILENT


def taken(work) -> int:
    """Most bytes that arrays held at one time; a first call, not traced, loads what is loaded once."""
    work()
    tracemalloc.start()
    try:
        work()
        return tracemalloc.get_traced_memory()[1]
    finally:
        tracemalloc.stop()


@pytest.mark.parametrize("n", [8, 10])
def test_a_determinant_search_takes_no_more_than_the_estimate_and_not_far_less(n):
    hamiltonian = molecule(chain(n, 0.9))
    peak, foretold = taken(lambda: lowest_level(hamiltonian, budget_bytes=2**32)), determinant_bytes(hamiltonian)
    assert peak <= 1.2 * foretold
    assert foretold < 6 * peak


def test_more_levels_are_foretold_to_take_more_and_are_refused_on_the_way():
    hamiltonian = molecule(chain(8, 0.9))
    budget = determinant_bytes(hamiltonian, 4)
    assert budget > determinant_bytes(hamiltonian)
    assert lowest_levels(hamiltonian, 1, budget_bytes=budget)
    with pytest.raises(StudyError, match="GiB"):
        lowest_levels(hamiltonian, 12, budget_bytes=budget)


@pytest.mark.parametrize("model", [Heisenberg(), Ising()])
def test_a_search_on_sites_takes_no_more_than_the_estimate(model):
    expansion, budget = model.hamiltonian(Chain(sites=16)), 2**31
    peak = taken(lambda: lowest_level_spins(expansion, watch=SILENT, budget_bytes=budget))
    assert peak <= spin_bytes(expansion, budget) < 6 * peak


def test_a_small_budget_shortens_the_chain_that_is_kept():
    expansion = Heisenberg().hamiltonian(Chain(sites=16))
    roomy, tight = 2**31, 2**22
    assert spin_bytes(expansion, tight) < 0.8 * spin_bytes(expansion, roomy)
    assert taken(lambda: lowest_level_spins(expansion, watch=SILENT, budget_bytes=tight)) < tight
