"""Continuation: Hamiltonians on the way keep the reference as an eigenstate at their easy end, and lead to the full one."""

from __future__ import annotations

import numpy as np
import pytest
from support.dense import expansion_matrix
from support.hamiltonians import chain, molecule, random_molecule
from support.second_quantised import hamiltonian_matrix

from thalweg.ansatz import UCCSD, HardwareEfficient
from thalweg.optimize.objective import StopRules
from thalweg.study.continuation import system_partway
from thalweg.study.events import Stage
from thalweg.study.repeat import repeat
from thalweg.study.run import run
from thalweg.study.spec import StudySpec, with_setting
from thalweg.systems import LatticeModel, Molecule
from thalweg.systems.prepared import PreparedSystem
from thalweg.systems.spin_reference import SpinReference
from thalweg.watch import SILENT

FOUR = StudySpec(system=Molecule(name="chain", atoms=tuple(("H", 0.0, 0.0, 1.5 * i) for i in range(4))))


def prepared_of(hamiltonian) -> PreparedSystem:
    return PreparedSystem("test", hamiltonian, None, "hartree", "reference", hamiltonian.reference_energy)


@pytest.mark.parametrize("hamiltonian", [molecule(chain(4, 1.5)), random_molecule(3, 2, 1)], ids=["H4", "random"])
def test_electrons_go_from_a_mean_field_of_which_the_reference_is_an_eigenstate_to_the_full_hamiltonian(hamiltonian):
    prepared = prepared_of(hamiltonian)
    full = hamiltonian_matrix(hamiltonian)
    easy = hamiltonian_matrix(system_partway(prepared, 0.0).fermions)
    start = np.zeros(len(full))
    alpha, beta = (
        [s for s in range(1 << hamiltonian.n_orbitals) if s.bit_count() == n] for n in (hamiltonian.sector.n_alpha, hamiltonian.sector.n_beta)
    )
    start[alpha.index(hamiltonian.reference[0]) * len(beta) + beta.index(hamiltonian.reference[1])] = 1.0
    np.testing.assert_allclose(easy @ start, hamiltonian.reference_energy * start, atol=1e-10)
    np.testing.assert_allclose(hamiltonian_matrix(system_partway(prepared, 0.3).fermions), 0.7 * easy + 0.3 * full, atol=1e-10)
    np.testing.assert_allclose(hamiltonian_matrix(system_partway(prepared, 1.0).fermions), full, atol=1e-12)


def test_the_mean_field_of_a_closed_shell_has_the_reference_as_its_ground_state():
    hamiltonian = molecule(chain(4, 0.9))
    easy = hamiltonian_matrix(system_partway(prepared_of(hamiltonian), 0.0).fermions)
    assert np.linalg.eigvalsh(easy)[0] == pytest.approx(hamiltonian.reference_energy, abs=1e-9)


@pytest.mark.parametrize("reference", ["neel", "plus", "singlets"])
@pytest.mark.parametrize("model", ["heisenberg", "ising"])
def test_spins_begin_at_terms_of_which_the_reference_is_an_eigenstate(model, reference):
    spec = with_setting(StudySpec(system=LatticeModel(reference=reference)), "system.model", model)
    prepared = with_setting(spec, "system.lattice.sites", 4).system.prepare(SILENT, budget_bytes=2**31)
    easy = system_partway(prepared, 0.0).spins
    assert np.linalg.eigvalsh(expansion_matrix(easy)).min() <= prepared.reference_energy + 1e-9
    state = SpinReference("", prepared.reference_kind, prepared.reference_bits, prepared.reference_pairs)
    assert state.energy(easy) == pytest.approx(prepared.reference_energy)
    half = system_partway(prepared, 0.5).spins
    expected = 0.5 * (expansion_matrix(easy) + expansion_matrix(prepared.spins))
    np.testing.assert_allclose(expansion_matrix(half), expected, atol=1e-12)


def test_continuation_ends_at_the_full_hamiltonian_and_begins_its_curve_below_the_reference():
    events = []
    plain, slow = run(FOUR), run(FOUR.model_copy(update={"continuation": 5}), events.append)
    assert slow.energy == pytest.approx(plain.energy, abs=1e-7)
    assert slow.trace.energy[0] < plain.trace.energy[0] - 1e-3
    assert slow.trace.iteration == tuple(range(slow.iterations + 1))
    assert slow.trace.evaluations[0] > 1
    assert slow.evaluations > len(slow.trace.energy)
    assert next(e.text for e in events if isinstance(e, Stage) and "of the way" in e.text).startswith("Hamiltonian 20%")
    assert repeat(slow).deviation < 1e-12


@pytest.mark.parametrize("encoding", ["jordan-wigner", "parity"])
def test_circuits_on_qubits_follow_too(encoding):
    spec = FOUR.model_copy(update={"ansatz": HardwareEfficient(depth=2), "continuation": 3})
    result = run(with_setting(spec, "encoding", encoding))
    assert result.trace.energy[0] < result.reference_energy - 1e-3
    assert result.energy <= result.trace.energy[0]


def test_evaluations_on_the_way_count_towards_the_limit():
    spec = FOUR.model_copy(update={"continuation": 4, "stop": StopRules(evaluations=12), "ansatz": UCCSD()})
    result = run(spec)
    assert result.stop_reason == "evaluations"
    assert result.evaluations <= 12 + 3  # each Hamiltonian gets one evaluation at least
    assert np.isfinite(result.energy)


def test_one_step_is_the_plain_search():
    plain, one = (run(FOUR.model_copy(update={"continuation": steps})) for steps in (0, 1))
    assert path_of(plain) == path_of(one)


def path_of(result):
    return tuple(result.trace.energy), result.final_parameters
