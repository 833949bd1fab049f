"""Exchange layers: what they keep, what they reach, what they refuse."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from scipy.linalg import expm
from support.dense import string_matrix

from thalweg.ansatz import ExchangeLayers
from thalweg.ansatz.exchange_layers import disjoint_sets
from thalweg.ansatz.ground import Ground
from thalweg.errors import StudyError
from thalweg.simulate.register import RegisterEngine
from thalweg.study.run import run
from thalweg.study.spec import StudySpec
from thalweg.systems import LatticeModel
from thalweg.systems.hubbard import Hubbard
from thalweg.systems.lattice import Chain, Triangular
from thalweg.systems.pauli_list import PauliList
from thalweg.systems.spin_models import Heisenberg


def ground_of(n: int = 6, lattice=None, **settings) -> Ground:
    prepared = LatticeModel(model=Heisenberg(), lattice=Chain(sites=n) if lattice is None else lattice, **settings).prepare()
    return Ground(None, prepared.spins, prepared.reference_bits, None, prepared.reference_kind, prepared.reference_pairs)


@pytest.mark.parametrize("reference", [{"reference": "neel"}, {"reference": "singlets"}, {"reference": "bits", "bits": "110001"}])
@pytest.mark.parametrize(("generator", "bonds", "angles"), list(product(["xx+yy", "xy-yx"], ["model", "line", "ring"], ["bond", "set"])))
def test_s_z_is_kept_exactly(reference, generator, bonds, angles):
    ground = ground_of(**reference)
    program = ExchangeLayers(depth=2, generator=generator, bonds=bonds, angles=angles).build(ground)
    state = RegisterEngine(ground.qubits, program).state(np.random.default_rng(4).normal(size=program.n_parameters))
    ones = np.bitwise_count(np.arange(64, dtype=np.uint64))
    weights = np.abs(state) ** 2
    assert weights[ones != 3].sum() < 1e-24
    assert float(weights @ (3.0 - ones)) == pytest.approx(0.0, abs=1e-12)
    assert np.count_nonzero(weights > 1e-6) > 4


@pytest.mark.parametrize(("generator", "second", "sign"), [("xx+yy", "YY", 1), ("xy-yx", "YX", -1)])
def test_a_gate_is_the_exponential_that_its_description_states(generator, second, sign):
    ground = ground_of(2, Chain(sites=2, periodic=False))
    program = ExchangeLayers(depth=1, generator=generator, site_phases=False).build(ground)
    theta, phi = 0.8, -0.5
    letters = {"X": (1, 0), "Y": (1, 1), "Z": (0, 1)}

    def pair(text: str) -> np.ndarray:
        (xa, za), (xb, zb) = (letters[c] for c in text)
        return string_matrix(2, xa | xb << 1, za | zb << 1)

    first = pair("XX") if second == "YY" else pair("XY")
    gate = expm(-0.5j * phi * pair("ZZ")) @ expm(-0.5j * theta * (first + sign * pair(second)) / 2)
    state = RegisterEngine(ground.qubits, program).state(np.array([theta, phi]))
    np.testing.assert_allclose(state, gate[:, ground.reference_bits], atol=1e-13)


def test_sets_hold_disjoint_bonds_and_each_bond_once():
    ground = ground_of(lattice=Triangular(columns=3, rows=3))
    pairs = ExchangeLayers()._pairs(ground)
    sets = disjoint_sets(pairs)
    assert sorted(bond for bonds in sets for bond in bonds) == pairs
    assert len(pairs) == 27
    for bonds in sets:
        sites = [site for bond in bonds for site in bond]
        assert len(sites) == len(set(sites))


@pytest.mark.parametrize(("phase", "site_phases", "angles", "count"), [(True, True, "bond", 18), (False, True, "set", 8), (True, False, "set", 4)])
def test_parameters_are_counted_and_named(phase, site_phases, angles, count):
    program = ExchangeLayers(depth=3, phase=phase, site_phases=site_phases, angles=angles).build(ground_of())
    assert program.n_parameters == 3 * count == len(set(program.labels()))
    assert sorted(set(program.parameter[program.parameter >= 0].tolist())) == list(range(3 * count))


def test_a_deeper_circuit_can_give_the_state_of_a_shallower_one():
    ground = ground_of(reference="singlets")
    shallow, deep = (ExchangeLayers(depth=d) for d in (1, 2))
    small, large = shallow.build(ground), deep.build(ground)
    theta = np.random.default_rng(6).normal(size=small.n_parameters)
    states = (
        RegisterEngine(ground.qubits, small).state(theta),
        RegisterEngine(ground.qubits, large).state(deep.from_shallower(theta, large.n_parameters)),
    )
    np.testing.assert_allclose(*states, atol=1e-14)


@pytest.mark.parametrize(("reference", "depth"), [("neel", 4), ("singlets", 3)])
def test_the_ring_of_six_is_reached_in_its_sector(reference, depth):
    system = LatticeModel(model=Heisenberg(), lattice=Chain(sites=6), reference=reference)
    result = run(StudySpec(system=system, ansatz=ExchangeLayers(depth=depth)))
    assert result.verdict_kind == "reached"
    assert result.s_z == pytest.approx(0.0, abs=1e-12)
    assert result.exact_energy / 6 == pytest.approx(-0.467129273, abs=1e-9)  # Bonner and Fisher 1964


@pytest.mark.parametrize(
    ("system", "settings", "field"),
    [
        (LatticeModel(model=Hubbard(), lattice=Chain(sites=2, periodic=False)), {}, "ansatz"),
        (LatticeModel(model=Heisenberg(), reference="plus"), {}, "system.reference"),
        (LatticeModel(model=PauliList(terms="Z0 + Z1")), {}, "ansatz.bonds"),
        (LatticeModel(model=PauliList(terms="Z0"), lattice=Chain(sites=1)), {"bonds": "line"}, "ansatz.bonds"),
    ],
)
def test_what_does_not_fit_is_refused(system, settings, field):
    with pytest.raises(StudyError) as error:
        run(StudySpec(system=system, ansatz=ExchangeLayers(**settings)))
    assert error.value.field == field
