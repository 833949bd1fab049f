"""The register engine on molecules, against openfermion's sparse operators and mapping made from the same stored integrals."""

from functools import lru_cache

import numpy as np
import pytest
from support.molecules import stored_molecule

from thalweg.ansatz.ground import Ground
from thalweg.ansatz.hardware_efficient import HardwareEfficient
from thalweg.encoding.interchange import from_qubit_operator
from thalweg.simulate.register import RegisterEngine

#: Full CI energies stored in the files, Eh (openfermion package, folder testing/data); recomputation agrees to 5e-8.
STORED = {"H2_sto-3g_singlet_0.7414": -1.13727017463, "H1-Li1_sto-3g_singlet_1.45": -7.88098231483}


@lru_cache
def mapped(name):
    """(expansion, sparse matrix with qubit 0 as the least significant bit of the index)."""
    import openfermion

    data, _ = stored_molecule(name)
    operator = openfermion.jordan_wigner(data.get_molecular_hamiltonian())
    n = 2 * data.n_orbitals
    order = np.array([int(format(a, f"0{n}b")[::-1], 2) for a in range(1 << n)])  # openfermion: qubit 0 most significant
    matrix = openfermion.get_sparse_operator(operator, n).tocsr()[order][:, order]
    return from_qubit_operator(operator, n), matrix


@pytest.mark.parametrize("rotations", ["ry", "ry-rz"])
@pytest.mark.parametrize("name", list(STORED))
def test_energy_variance_and_image_agree_with_sparse_operators(name, rotations):
    expansion, matrix = mapped(name)
    reference = (1 << 2 * (1 if name.startswith("H2") else 2)) - 1
    program = HardwareEfficient(depth=2, rotations=rotations).build(Ground(None, expansion, reference))
    engine = RegisterEngine(expansion, program)
    parameters = np.random.default_rng(3).normal(0.0, 0.4, program.n_parameters)
    state = engine.state(parameters)
    image = matrix @ state
    energy = np.vdot(state, image).real
    assert engine.energy(parameters) == pytest.approx(energy, abs=1e-12)
    assert engine.facts(parameters, None).variance == pytest.approx(np.vdot(image, image).real - energy**2, abs=1e-10)
    assert energy > STORED[name]


@pytest.mark.parametrize("name", list(STORED))
def test_zero_angles_give_the_stored_hartree_fock_energy(name):
    expansion, _ = mapped(name)
    data, _ = stored_molecule(name)
    program = HardwareEfficient(depth=1).build(Ground(None, expansion, (1 << data.n_electrons) - 1))
    assert RegisterEngine(expansion, program).energy(np.zeros(program.n_parameters)) == pytest.approx(float(data.hf_energy), abs=5e-8)


def test_the_exact_state_of_hydrogen_has_full_weight_and_no_variance():
    """One angle on the pair of determinants |0011> and |1100> reaches full CI in the minimal basis (textbook H2)."""
    from thalweg.circuit.program import Gate, GateProgram

    expansion, matrix = mapped("H2_sto-3g_singlet_0.7414")
    block = matrix[[0b0011, 0b1100]][:, [0b0011, 0b1100]].toarray().real
    energies, vectors = np.linalg.eigh(block)
    angle = 2 * np.arctan2(vectors[1, 0], vectors[0, 0])
    program = GateProgram(
        4,
        0b0011,
        np.array([Gate.ROTATION], np.uint8),
        np.array([0b1111], np.uint64),
        np.array([0b0001], np.uint64),
        np.zeros(1, np.int64),
        np.ones(1),
        1,
    )
    engine = RegisterEngine(expansion, program)
    exact = np.zeros((1, 16), dtype=complex)
    exact[0, [0b0011, 0b1100]] = vectors[:, 0]
    best = min((engine.facts(np.array([sign * angle]), exact) for sign in (1, -1)), key=lambda facts: facts.variance)
    assert energies[0] == pytest.approx(STORED["H2_sto-3g_singlet_0.7414"], abs=5e-8)
    assert best.fidelity == pytest.approx(1.0, abs=1e-12)
    assert best.variance == pytest.approx(0.0, abs=1e-15)
    assert best.leading[0].weight == pytest.approx(best.leading[0].exact_weight, abs=1e-12)
