"""UCCSD products: counts, order, ties, starts, and the errors of the literature's small molecules."""

from __future__ import annotations

import numpy as np
import pytest
from reference.fermion_energies import UCCSD_COUNTS, UCCSD_ERRORS, WATER_UCCSD_ERRORS
from scipy.optimize import minimize
from support.hamiltonians import GEOMETRIES, chain, molecule, random_molecule, water

from thalweg.ansatz.coupled_cluster import LARGEST_START, UCCSD
from thalweg.ansatz.ground import Ground
from thalweg.errors import StudyError
from thalweg.exact.determinant import lowest_level
from thalweg.simulate.sector import SectorEngine, SectorHamiltonian

BUDGET = 2**31


def build(hamiltonian, **options):
    return UCCSD(**options).build(Ground(hamiltonian, None, 0))


def start(hamiltonian, program, **options):
    return UCCSD(**options).start_parameters(Ground(hamiltonian, None, 0), program, np.random.default_rng(1))


@pytest.mark.parametrize(("name", "count"), UCCSD_COUNTS.items())
def test_spin_orbital_parameter_counts_are_the_published_ones(name, count):
    atoms = {"H4": chain(4, 0.9), "H6": chain(6, 1.0), "H2O": water()}.get(name) or GEOMETRIES[name]
    assert build(molecule(atoms), point_group=False).n_parameters == count


def test_the_point_group_of_nitrogen_leaves_91_parameters():
    assert build(molecule(GEOMETRIES["N2"])).n_parameters == 91


def lowest_error(hamiltonian, order):
    shared = SectorHamiltonian(hamiltonian)
    exact = lowest_level(hamiltonian, budget_bytes=BUDGET, sector_hamiltonian=shared)
    program = build(hamiltonian, order=order)
    engine = SectorEngine(hamiltonian, program, shared)
    offset = hamiltonian.reference_energy

    def shifted(theta):
        energy, gradient = engine.energy_and_gradient(theta)
        assert energy >= exact.energy - 1e-9
        return energy - offset, gradient

    found = minimize(shifted, start(hamiltonian, program), jac=True, method="L-BFGS-B", options={"ftol": 0, "gtol": 1e-6, "maxiter": 500})
    assert np.abs(found.jac).max() <= 1e-5
    return 1e3 * (found.fun + offset - exact.energy)


@pytest.mark.parametrize("name", UCCSD_ERRORS)
@pytest.mark.parametrize("order", ["doubles-first", "singles-first"])
def test_errors_are_those_recomputed_independently(name, order):
    atoms, errors, tolerances = UCCSD_ERRORS[name]
    which = ["doubles-first", "singles-first"].index(order)
    tolerance = tolerances if isinstance(tolerances, float) else tolerances[which]
    assert lowest_error(molecule(atoms), order) == pytest.approx(errors[which], abs=0.51 * tolerance)


@pytest.mark.parametrize(("order", "error"), [("doubles-first", WATER_UCCSD_ERRORS[0]), ("singles-first", WATER_UCCSD_ERRORS[1])])
def test_water_errors_are_those_recomputed_independently(order, error):
    assert lowest_error(molecule(water()), order) == pytest.approx(error, abs=0.51e-3)


def test_the_order_is_doubles_by_spin_then_singles_and_is_recorded():
    program = build(random_molecule(4, 2, 2))
    labels = program.labels()
    assert labels[:3] == ("0a 1a -> 2a 3a", "0b 1b -> 2b 3b", "0a 0b -> 2a 2b")
    assert labels[3:5] == ("0a 0b -> 2a 3b", "0a 0b -> 3a 2b")
    assert labels[-8:] == ("0a -> 2a", "0a -> 3a", "1a -> 2a", "1a -> 3a", "0b -> 2b", "0b -> 3b", "1b -> 2b", "1b -> 3b")
    assert program.order.startswith("doubles aa, bb, ab act first")
    assert build(random_molecule(4, 2, 2), order="singles-first").order.startswith("singles a, b act first")


def test_tied_amplitudes_join_mirror_images():
    program = build(random_molecule(4, 2, 2), spin_tied=True)
    labels = program.labels()
    assert "0a 1a -> 2a 3a; 0b 1b -> 2b 3b" in labels
    assert "0a 1b -> 2a 3b; 1a 0b -> 3a 2b" in labels
    assert "0a 0b -> 2a 2b" in labels
    assert program.n_parameters == len(labels) == 1 + 4 + 10
    assert set(program.parameter.tolist()) == set(range(program.n_parameters))


@pytest.mark.parametrize(("m", "n_alpha", "n_beta", "count"), [(1, 1, 1, 0), (3, 3, 3, 0), (3, 1, 0, 2), (3, 2, 1, 8), (4, 0, 2, 5), (4, 3, 0, 3)])
def test_open_shells_and_empty_spaces_have_their_own_excitations(m, n_alpha, n_beta, count):
    assert build(random_molecule(m, n_alpha, n_beta), point_group=False).n_parameters == count


def test_mp2_start_of_a_closed_shell_gives_the_mp2_energy_to_first_order():
    """sum of amplitude times matrix element is the MP2 correlation energy (Szabo and Ostlund, section 6.5)."""
    from pyscf import gto, mp, scf

    h = molecule(chain(4, 0.9), symmetry=False)
    program = build(h, start="mp2")
    theta = start(h, program, start="mp2")
    _, slope = SectorEngine(h, program).energy_and_gradient(np.zeros(program.n_parameters))
    field = scf.RHF(gto.M(atom=chain(4, 0.9), basis="sto-3g", verbose=0)).run(conv_tol=1e-12)
    assert 0.5 * theta @ slope == pytest.approx(mp.MP2(field).run().e_corr, abs=1e-7)
    assert np.allclose(theta[[i for i, e in enumerate(program.excitations) if e.rank == 1]], 0.0, atol=1e-6)


@pytest.mark.parametrize("tied", [False, True])
def test_mp2_start_lies_below_the_reference(tied):
    for atoms, spin in ((chain(4, 0.9), 0), (GEOMETRIES["BeH"], 1), (GEOMETRIES["H3"], 1)):
        h = molecule(atoms, spin=spin)
        program = build(h, spin_tied=tied)
        theta = start(h, program, start="mp2")
        assert SectorEngine(h, program).energy(theta) < h.reference_energy - 1e-3


def test_mp2_start_stays_finite_where_orbital_energies_coincide():
    h = random_molecule(4, 2, 2)
    theta = start(h, build(h), start="mp2")
    assert np.all(np.isfinite(theta))
    assert np.abs(theta).max() <= LARGEST_START


def test_spin_models_are_refused_in_words():
    with pytest.raises(StudyError, match="spins instead of electrons"):
        build(None)
