"""The sector engine against dense Fock-space matrices, finite differences, and its own invariants."""

from __future__ import annotations

import numpy as np
import pytest
from support.hamiltonians import chain, molecule, random_molecule
from support.second_quantised import hamiltonian_matrix, program_state

from thalweg.ansatz.coupled_cluster import UCCSD
from thalweg.ansatz.ground import Ground
from thalweg.circuit.program import Excitation, ExcitationProgram
from thalweg.errors import StudyError
from thalweg.operators import Sector
from thalweg.simulate.sector import SectorEngine, SectorHamiltonian

# one electron, empty virtual space, one spin only, odd electron numbers, and a point group of order 2 and 4
CASES = [
    (1, 1, 0, ()),
    (1, 1, 1, ()),
    (2, 1, 1, (0, 1)),
    (3, 1, 0, ()),
    (3, 0, 2, (0, 1, 0)),
    (3, 3, 3, ()),
    (3, 2, 1, (0, 1, 1)),
    (4, 2, 2, (0, 1, 2, 3)),
    (4, 3, 1, (0, 0, 1, 1)),
    (4, 4, 2, ()),
    (5, 2, 3, (0, 1, 0, 2, 1)),
]


def uccsd(hamiltonian, **options):
    return UCCSD(**options).build(Ground(hamiltonian, None, 0))


def random_program(sector: Sector, reference: tuple[int, int], seed: int, n_factors: int = 14) -> ExcitationProgram:
    """Generalised excitations of rank 1 and 2 in any order, orbitals in common allowed, parameters shared with factors."""
    rng = np.random.default_rng(seed)
    m = sector.n_orbitals
    factors = []
    while len(factors) < n_factors:
        kind = rng.choice(["a", "b", "aa", "bb", "ab"])
        pick = [tuple(sorted(rng.choice(m, size=min(m, kind.count(s)), replace=False).tolist())) for s in "aabb"]
        factors.append(Excitation(*pick))
    n_parameters = max(1, n_factors // 2)
    parameter = np.concatenate([np.arange(n_parameters), rng.integers(0, n_parameters, n_factors - n_parameters)])
    return ExcitationProgram(sector, reference, tuple(factors), parameter, rng.normal(size=n_factors), n_parameters)


def random_parameters(program: ExcitationProgram, seed: int = 3, width: float = 0.4) -> np.ndarray:
    return np.random.default_rng(seed).normal(0.0, width, program.n_parameters)


@pytest.mark.parametrize(("m", "n_alpha", "n_beta", "irreps"), CASES)
@pytest.mark.parametrize("kind", ["uccsd", "singles-first", "tied", "generalised"])
def test_state_and_energy_agree_with_dense_exponentials(m, n_alpha, n_beta, irreps, kind):
    h = random_molecule(m, n_alpha, n_beta, irreps)
    if kind == "generalised":
        program = random_program(h.sector, h.reference, seed=m)
    else:
        program = uccsd(h, order="singles-first" if kind == "singles-first" else "doubles-first", spin_tied=kind == "tied")
    theta = random_parameters(program)
    engine = SectorEngine(h, program)
    expected = program_state(program, theta)
    assert np.allclose(engine.state(theta), expected, atol=1e-12)
    psi = expected.ravel()
    assert engine.energy(theta) == pytest.approx(psi @ hamiltonian_matrix(h) @ psi, abs=1e-10)


@pytest.mark.parametrize(("m", "n_alpha", "n_beta", "irreps"), CASES)
@pytest.mark.parametrize("kind", ["uccsd", "tied", "generalised"])
def test_gradient_agrees_with_central_differences(m, n_alpha, n_beta, irreps, kind):
    h = random_molecule(m, n_alpha, n_beta, irreps, seed=2)
    program = random_program(h.sector, h.reference, seed=m + 7) if kind == "generalised" else uccsd(h, spin_tied=kind == "tied")
    theta = random_parameters(program)
    engine = SectorEngine(h, program)
    energy, gradient = engine.energy_and_gradient(theta)
    assert energy == pytest.approx(engine.energy(theta), abs=1e-11)
    assert gradient.shape == (program.n_parameters,)
    step = 1e-5
    for k in range(program.n_parameters):
        shift = step * np.eye(program.n_parameters)[k]
        slope = (engine.energy(theta + shift) - engine.energy(theta - shift)) / (2 * step)
        assert gradient[k] == pytest.approx(slope, abs=1e-6)


def test_point_group_and_whole_sector_give_the_same_state():
    h = molecule(chain(4, 1.3))
    whole = SectorEngine(h, uccsd(h, point_group=False))
    symmetric_program = uccsd(h)
    symmetric = SectorEngine(h, symmetric_program)
    theta = random_parameters(symmetric_program)
    kept = dict(zip(symmetric_program.excitations, theta, strict=True))
    everywhere = np.array([kept.get(e, 0.0) for e in uccsd(h, point_group=False).excitations])
    assert np.allclose(whole.state(everywhere), symmetric.state(theta), atol=1e-12)
    assert whole.energy(everywhere) == pytest.approx(symmetric.energy(theta), abs=1e-11)


def test_two_engines_share_one_product():
    h = molecule(chain(4, 1.3))
    shared = SectorHamiltonian(h)
    program = uccsd(h)
    theta = random_parameters(program)
    first, second = SectorEngine(h, program, shared), SectorEngine(h, uccsd(h, order="singles-first"), shared)
    assert first.energy(theta) == pytest.approx(SectorEngine(h, program).energy(theta), abs=1e-12)
    assert second.energy(np.zeros(program.n_parameters)) == pytest.approx(h.reference_energy, abs=1e-10)


def test_facts_of_the_reference_are_those_of_a_determinant():
    h = molecule("Be 0 0 0; H 0 0 1.3426", spin=1)
    program = uccsd(h)
    facts = SectorEngine(h, program).facts(np.zeros(program.n_parameters), None)
    assert facts.n_electrons == pytest.approx(5)
    assert facts.s_z == pytest.approx(0.5)
    assert facts.s_squared == pytest.approx(0.75)
    assert facts.fidelity is None
    assert [state.label for state in facts.leading] == ["22a 000"]
    assert np.allclose(facts.natural_occupations, [2, 2, 1, 0, 0, 0], atol=1e-12)


@pytest.mark.parametrize(("m", "n_alpha", "n_beta", "irreps"), CASES)
def test_facts_agree_with_dense_operators(m, n_alpha, n_beta, irreps):
    from support.second_quantised import annihilators, sector_positions

    h = random_molecule(m, n_alpha, n_beta, irreps, seed=5)
    program = random_program(h.sector, h.reference, seed=m + 20)
    theta = random_parameters(program)
    engine = SectorEngine(h, program)
    matrix = hamiltonian_matrix(h)
    values, vectors = np.linalg.eigh(matrix)
    ground = vectors[:, np.abs(values - values[0]) < 1e-9].T.reshape(-1, *h.sector.shape)
    facts = engine.facts(theta, ground)
    psi = program_state(program, theta).ravel()
    a = annihilators(2 * m)
    raising = sum(a[p].T @ a[m + p] for p in range(m))
    full = np.zeros(1 << 2 * m)
    full[sector_positions(h.sector).ravel()] = psi
    raised = raising @ full
    s_z = 0.5 * (n_alpha - n_beta)
    assert facts.s_squared == pytest.approx(raised @ raised + s_z * (s_z + 1), abs=1e-10)
    assert facts.variance == pytest.approx(psi @ matrix @ matrix @ psi - (psi @ matrix @ psi) ** 2, abs=1e-8)
    assert facts.fidelity == pytest.approx(sum((v.ravel() @ psi) ** 2 for v in ground), abs=1e-10)
    assert facts.n_electrons == pytest.approx(n_alpha + n_beta)
    density = np.array([[full @ ((a[p].T @ a[q] + a[m + p].T @ a[m + q]) @ full) for q in range(m)] for p in range(m)])
    assert np.allclose(facts.natural_occupations, np.linalg.eigvalsh(density)[::-1], atol=1e-10)
    weights = [state.weight for state in facts.leading]
    assert weights == sorted(weights, reverse=True)
    assert weights[0] == pytest.approx((psi**2).max())


def test_energy_never_falls_below_the_lowest_eigenvalue():
    h = random_molecule(4, 2, 2, seed=9)
    lowest = np.linalg.eigvalsh(hamiltonian_matrix(h))[0]
    program = uccsd(h)
    engine = SectorEngine(h, program)
    for seed in range(20):
        assert engine.energy(random_parameters(program, seed, width=2.0)) >= lowest - 1e-10


def test_an_engine_past_the_budget_is_refused_before_it_is_built():
    h = molecule(chain(6, 1.0))
    program = uccsd(h)
    with pytest.raises(StudyError, match="memory budget") as refusal:
        SectorEngine(h, program, budget_bytes=1000)
    assert "GiB" in refusal.value.why
    assert SectorEngine(h, program, budget_bytes=2**30).memory_bytes() < 2**30
