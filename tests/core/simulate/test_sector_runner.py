"""The planned runner of large programs against the plain one of small programs, which the dense tests hold."""

from __future__ import annotations

from itertools import pairwise, product

import numpy as np
import pytest
from support.hamiltonians import random_molecule

from thalweg.ansatz.coupled_cluster import UCCSD
from thalweg.ansatz.ground import Ground
from thalweg.circuit.program import Excitation
from thalweg.errors import Stopped
from thalweg.operators.fermion import WeightedDeterminant
from thalweg.operators.sector_layout import sector_layout, sector_spaces
from thalweg.simulate import sector_plan, sector_runner
from thalweg.simulate.sector_plan import stretches
from thalweg.simulate.sector_runner import SectorRunner
from thalweg.simulate.sector_small import SmallRunner
from thalweg.watch import Watch

# odd sizes, one electron, one spin only, empty virtual space, 1, 2, 4 and 8 irreps
CASES = [
    (1, 1, 0, ()),
    (2, 1, 1, (0, 1)),
    (3, 0, 2, ()),
    (3, 3, 3, ()),
    (5, 4, 1, (0, 1, 0, 1, 1)),
    (6, 3, 2, (0, 1, 2, 3, 0, 1)),
    (7, 3, 4, ()),
    (7, 4, 4, (0, 1, 2, 4, 7, 3, 0)),
]


def layout_of(m, n_alpha, n_beta, irreps):
    h = random_molecule(m, n_alpha, n_beta, irreps)
    alpha, beta = sector_spaces(h.sector, h.orbital_irreps)
    return h, sector_layout(alpha, beta, h.irrep_of(*h.reference))


def symmetric_factors(h, seed, count=40):
    """Generalised excitations in any order that keep the point group, orbitals in common allowed."""
    rng = np.random.default_rng(seed)
    m, labels = h.n_orbitals, h.orbital_irreps
    found = []
    while len(found) < count:
        kind = rng.choice(["a", "b", "aa", "bb", "ab"])
        picks = [tuple(sorted(rng.choice(m, size=min(m, kind.count(s)), replace=False).tolist())) for s in "aabb"]
        product = np.bitwise_xor.reduce(labels[[p for pick in picks for p in pick]])
        if product == 0 and (picks[0] != picks[1] or picks[2] != picks[3]):
            found.append(Excitation(*picks))
        elif m == 1:
            return []
    return found


def programs(h):
    ground = Ground(h, None, 0)
    yield list(UCCSD().build(ground).excitations)
    yield list(UCCSD(order="singles-first").build(ground).excitations)
    yield symmetric_factors(h, seed=5)


def alone(h):
    return (WeightedDeterminant(1.0, *h.reference),)


def begins_of(h, layout):
    """The reference alone, and a combination of determinants of its irrep."""
    positions = np.random.default_rng(8).choice(layout.size, min(4, layout.size), replace=False)
    alpha, beta = layout.masks(positions)
    return [alone(h), tuple(WeightedDeterminant(0.9 - 0.4 * i, int(a), int(b)) for i, (a, b) in enumerate(zip(alpha, beta, strict=True)))]


@pytest.mark.parametrize("case", CASES)
@pytest.mark.parametrize("worth", [0, 1e9])
@pytest.mark.parametrize("chunk", [64, 2**19])
def test_planned_and_plain_runs_agree_forward_and_back(case, worth, chunk, monkeypatch):
    monkeypatch.setattr(sector_plan, "WORTH_A_VIEW", worth)
    monkeypatch.setattr(sector_runner, "CHUNK_BYTES", chunk)
    monkeypatch.setattr(sector_runner, "SET_BYTES", chunk // 16)
    monkeypatch.setattr(sector_runner, "PAIRS_PER_CALL", 50.0 if chunk == 64 else 2e7)
    sector_runner.compiled.cache_clear()
    h, layout = layout_of(*case)
    rng = np.random.default_rng(3)
    for excitations, begins in product(programs(h), begins_of(h, layout)):
        angles = rng.normal(0.0, 0.5, len(excitations))
        planned, plain = SectorRunner(excitations, layout), SmallRunner(excitations, layout)
        for _ in range(2):  # buffers are used again
            psi, expected = planned.forward(begins, angles), plain.forward(begins, angles)
            assert np.allclose(psi, expected, rtol=0, atol=1e-12)
            dual = rng.normal(size=layout.size)
            slopes, plain_slopes = planned.backward(psi, dual.copy(), angles), plain.backward(expected, dual.copy(), angles)
            assert np.allclose(slopes, plain_slopes, rtol=0, atol=1e-12)
    sector_runner.compiled.cache_clear()


def test_factors_run_in_program_order_up_to_commuting_neighbours():
    h, layout = layout_of(7, 3, 4, ())
    excitations = symmetric_factors(h, seed=9)
    plan = stretches(excitations, layout.alpha, layout.beta, layout.irrep)
    order = [f for stretch in plan for f in stretch.factors]
    assert sorted(order) == list(range(len(excitations)))
    for early, late in pairwise(order):
        if early > late:  # only an alpha-only and a beta-only factor may change places
            kinds = {bool(excitations[f].alpha_source) for f in (early, late)}
            assert kinds == {True, False}
            assert not any(excitations[f].alpha_source and excitations[f].beta_source for f in (early, late))


def test_uccsd_gives_each_alpha_source_its_own_view():
    h, layout = layout_of(8, 4, 4, ())
    excitations = list(UCCSD().build(Ground(h, None, 0)).excitations)
    plan = stretches(excitations, layout.alpha, layout.beta, layout.irrep)
    mixed = [stretch.view.last for stretch in plan if not stretch.view.rows_are_alpha]
    assert mixed == [0, 1, 2, 3]


def test_a_stop_is_heard_between_kernel_calls():
    h, layout = layout_of(6, 3, 2, ())
    excitations = list(UCCSD().build(Ground(h, None, 0)).excitations)
    runner = SectorRunner(excitations, layout)
    with pytest.raises(Stopped):
        runner.forward(alone(h), np.zeros(len(excitations)), Watch(should_stop=lambda: True))
