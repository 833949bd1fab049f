"""Reference states: their energies are expectation values in the states that they describe."""

from __future__ import annotations

import numpy as np
import pytest
from support.dense import expansion_matrix

from thalweg.errors import StudyError
from thalweg.systems.lattice import Chain, Honeycomb, Kagome, Ladder, Square
from thalweg.systems.lattice_model import LatticeModel
from thalweg.systems.spin_models import J1J2, XXZ, Heisenberg, Ising, Kitaev, RandomCouplings
from thalweg.systems.spin_reference import SpinReference, bit_text, choose_reference, parse_bits

GRAPH = Ladder(rungs=3, periodic=False).build()
MODELS = [Heisenberg(field=0.3), Ising(longitudinal=0.4), RandomCouplings(field_spread=1.0, field_axis="x"), XXZ(delta=-0.3)]


def state_of(reference: SpinReference, n: int) -> np.ndarray:
    if reference.kind == "plus":
        return np.full(1 << n, 2 ** (-n / 2))
    state = np.zeros(1 << n)
    if reference.kind == "bits":
        state[reference.bits] = 1.0
        return state
    state[0] = 1.0
    for a, b in reference.pairs:
        state = np.array([(state[i & ~(1 << a) & ~(1 << b)] * ((i >> b & 1) - (i >> a & 1))) / np.sqrt(2) for i in range(1 << n)])
    return state


@pytest.mark.parametrize("choice", ["up", "neel", "plus", "singlets", "bits"])
@pytest.mark.parametrize("model", MODELS, ids=lambda m: m.key)
def test_the_energy_is_the_expectation_value(model, choice):
    expansion = model.on_graph(GRAPH)
    reference = choose_reference(choice, "011010", "neel", GRAPH)
    state = state_of(reference, 6)
    assert np.linalg.norm(state) == pytest.approx(1.0)
    want = state @ expansion_matrix(expansion) @ state
    assert reference.energy(expansion) == pytest.approx(want.real, abs=1e-12)


def test_the_neel_state_alternates_and_singlets_carry_three_quarters_each():
    prepared = LatticeModel(lattice=Chain(sites=8), reference="neel").prepare()
    assert prepared.reference_energy == pytest.approx(-8 / 4)
    assert bit_text(prepared.reference_bits, 8) in ("01010101", "10101010")
    dimers = LatticeModel(lattice=Chain(sites=8), model=J1J2(), reference="singlets").prepare()
    assert dimers.reference_kind == "singlets"
    assert dimers.reference_energy == pytest.approx(-3 * 8 / 8)  # the exact Majumdar-Ghosh energy
    assert len(dimers.reference_pairs) == 4


def test_auto_takes_what_suits_model_and_lattice():
    assert LatticeModel(lattice=Square()).prepare().reference_name == "Neel state"
    assert LatticeModel(lattice=Kagome()).prepare().reference_name == "basis state 010101010101"
    assert LatticeModel(model=Ising()).prepare().reference_kind == "plus"


def test_states_that_do_not_exist_are_refused():
    with pytest.raises(StudyError, match="no Neel state"):
        LatticeModel(lattice=Kagome(), reference="neel").prepare()
    with pytest.raises(StudyError, match="no dimer state"):
        LatticeModel(lattice=Chain(sites=5), reference="singlets").prepare()
    with pytest.raises(StudyError, match="8 signs"):
        LatticeModel(reference="bits", bits="0101").prepare()
    with pytest.raises(StudyError, match="signs 0 or 1"):
        LatticeModel(reference="bits", bits="0101010x").prepare()


def test_bit_strings_begin_with_site_0():
    assert parse_bits("1 000", 4) == 1
    assert bit_text(0b1000, 4) == "0001"


def test_kitaev_starts_from_all_up():
    prepared = LatticeModel(lattice=Honeycomb(), model=Kitaev()).prepare()
    assert prepared.reference_energy == pytest.approx(-4.0)  # the four z bonds alone
