"""A study from a reference of the person's own: the search begins there, on every engine and register."""

from __future__ import annotations

import pytest
from support.scans import serial

from thalweg.ansatz import UCCGSD, UCCSD, Adaptive, AlternatingOperators, ExchangeLayers, HardwareEfficient, NumberConserving
from thalweg.errors import StudyError
from thalweg.evaluate import Shots
from thalweg.optimize import SPSA
from thalweg.study.path import BreathePath
from thalweg.study.run import run
from thalweg.study.scan_spec import ScanSpec
from thalweg.study.spec import StudySpec, spec_from_data, with_setting
from thalweg.systems import LatticeModel, Molecule
from thalweg.systems.lattice import Chain

FOUR = StudySpec(system=Molecule(name="chain", atoms=tuple(("H", 0.0, 0.0, 1.5 * i) for i in range(4))))


@pytest.mark.parametrize(
    "ansatz", [UCCSD(), UCCGSD(), Adaptive(), Adaptive(pool="pauli-strings"), HardwareEfficient(start="zero")], ids=lambda a: a.key
)
@pytest.mark.parametrize("encoding", ["jordan-wigner", "parity"])
@pytest.mark.parametrize(("reference", "name"), [("2020", "determinant 2020"), ("0.8*2200 - 0.6*2020", "0.8*2200 - 0.6*2020")])
def test_the_search_begins_at_the_reference(ansatz, encoding, reference, name):
    spec = with_setting(FOUR.model_copy(update={"reference": reference, "ansatz": ansatz}), "encoding", encoding)
    result = run(spec.model_copy(update={"stop": spec.stop.model_copy(update={"evaluations": 2})}))
    assert result.reference_name == name
    assert result.trace.energy[0] == pytest.approx(result.reference_energy, abs=1e-9)


def test_excitations_lead_from_the_determinant_to_the_exact_state():
    """All generalised excitations from another determinant of the same irrep come to the same ground state."""
    usual, other = (run(FOUR.model_copy(update={"ansatz": UCCGSD(start="small-random"), "reference": text})) for text in ("", "2020"))
    assert other.reference_energy > usual.reference_energy + 0.1
    assert other.error == pytest.approx(0.0, abs=1e-6)
    assert other.exact_energy == pytest.approx(usual.exact_energy, abs=1e-9)


def test_a_determinant_of_another_irrep_keeps_its_own_sector_and_stays_above_the_exact_energy():
    result = run(FOUR.model_copy(update={"reference": "2ab0"}))
    assert not result.reached_target
    assert result.n_electrons == pytest.approx(4.0, abs=1e-9)
    assert result.energy > result.exact_energy + 1e-3


@pytest.mark.parametrize("text", ["220", "2222", "2200 1"])
def test_a_reference_that_does_not_fit_is_refused_at_its_field(text):
    with pytest.raises(StudyError) as error:
        run(FOUR.model_copy(update={"reference": text}))
    assert error.value.field == "reference"


def test_digits_are_taken_as_text():
    assert with_setting(FOUR, "reference", "2200").reference == "2200"
    assert with_setting(FOUR, "reference", "0022").reference == "0022"
    assert spec_from_data(FOUR.model_dump() | {"reference": 2020}).reference == "2020"


def test_a_list_reaches_further_than_the_determinant_by_the_same_short_circuit():
    """Layers of number-conserving gates on stretched H4: from two determinants within the target, from one outside."""
    ansatz = NumberConserving(depth=2, start="zero")
    one, two = (run(FOUR.model_copy(update={"ansatz": ansatz, "reference": text})) for text in ("", "2200, 2020"))
    assert two.reference_energy < one.reference_energy - 0.01
    assert two.error < one.error
    assert two.n_electrons == pytest.approx(4.0, abs=1e-12)
    assert two.two_qubit_gates > one.two_qubit_gates  # the preparation is priced


def test_shots_measure_a_combination():
    spec = FOUR.model_copy(update={"reference": "0.8*2200 - 0.6*2020", "evaluation": Shots(shots=20_000), "optimizer": SPSA()})
    result = run(spec.model_copy(update={"stop": spec.stop.model_copy(update={"iterations": 2})}))
    assert abs(result.measured_energy - result.energy) < 5 * result.standard_error


def test_continuation_needs_a_reference_that_is_an_eigenstate_of_the_easy_part():
    with pytest.raises(StudyError, match="cannot begin at a combination"):
        run(FOUR.model_copy(update={"reference": "2200, 2020", "continuation": 4}))


@pytest.mark.parametrize("ansatz", [HardwareEfficient(start="zero", depth=2), ExchangeLayers(start="zero"), AlternatingOperators(start="zero")])
def test_a_combination_of_basis_states_is_where_spins_begin(ansatz):
    spec = StudySpec(system=LatticeModel(lattice=Chain(sites=4)), ansatz=ansatz, reference="0.8*0101 - 0.6*1010")
    result = run(spec.model_copy(update={"stop": spec.stop.model_copy(update={"evaluations": 1})}))
    assert result.trace.energy[0] == pytest.approx(result.reference_energy, abs=1e-9)
    assert "the combination of the reference" in result.operator_order or not isinstance(ansatz, AlternatingOperators)


@pytest.mark.parametrize("reference", ["plus", "singlets"])
def test_hardware_efficient_layers_begin_with_the_product_state_of_the_model(reference):
    """Two equal layers of controlled Z are the identity, so that zero angles leave the reference as it is."""
    system = LatticeModel(lattice=Chain(sites=4), reference=reference)
    spec = StudySpec(system=system, ansatz=HardwareEfficient(start="zero", depth=2))
    result = run(spec.model_copy(update={"stop": spec.stop.model_copy(update={"evaluations": 1})}))
    assert result.trace.energy[0] == pytest.approx(result.reference_energy, abs=1e-9)


def test_every_point_of_a_curve_finds_its_own_amplitudes():
    scan = ScanSpec(study=FOUR.model_copy(update={"reference": "2200, 2020"}), path=BreathePath(), points=(1.0, 1.3))
    names = {point.result.reference_name for point in serial(scan).points}
    assert len(names) == 2
