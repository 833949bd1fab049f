"""The curvature at the reference against second differences of the energy."""

from __future__ import annotations

import numpy as np
import pytest
from support.hamiltonians import GEOMETRIES, chain, molecule

from thalweg.ansatz.coupled_cluster import UCCSD
from thalweg.ansatz.ground import Ground
from thalweg.circuit.curvature import SMALLEST_PART, reference_curvature
from thalweg.circuit.program import Excitation, ExcitationProgram
from thalweg.simulate.sector import SectorEngine


def second_differences(hamiltonian, program, step=1e-3):
    engine = SectorEngine(hamiltonian, program)
    middle = engine.energy(np.zeros(program.n_parameters))
    shifts = step * np.eye(program.n_parameters)
    return np.array([engine.energy(s) + engine.energy(-s) - 2 * middle for s in shifts]) / step**2


@pytest.mark.parametrize(("atoms", "spin"), [(chain(4, 0.9), 0), (GEOMETRIES["BeH"], 1)])
@pytest.mark.parametrize("options", [{}, {"trotter_steps": 2}])
def test_curvature_is_the_second_derivative_at_the_reference(atoms, spin, options):
    h = molecule(atoms, spin=spin)
    program = UCCSD(**options).build(Ground(h, None, 0))
    expected = second_differences(h, program)
    assert np.allclose(reference_curvature(program, h), np.maximum(expected, SMALLEST_PART * expected.max()), atol=1e-4)


def test_reversed_excitations_count_and_others_get_the_middle():
    h = molecule(chain(4, 0.9))
    factors = (Excitation((2,), (0,)), Excitation((3,), (2,)), Excitation((0,), (0,)), Excitation((0,), (2,), (0,), (2,)))
    program = ExcitationProgram(h.sector, h.reference, factors, np.arange(4), np.array([1.0, 1.0, 1.0, -0.5]), 4)
    found, expected = reference_curvature(program, h), second_differences(h, program)
    assert np.allclose(found[[0, 3]], expected[[0, 3]], atol=1e-4)
    assert found[1] == found[2] == pytest.approx(np.median(expected[[0, 3]]), abs=1e-4)


def test_a_program_that_leaves_the_reference_alone_has_none():
    h = molecule(chain(4, 0.9))
    program = ExcitationProgram(h.sector, h.reference, (Excitation((3,), (2,)),), np.arange(1), np.ones(1), 1)
    assert reference_curvature(program, h) is None
