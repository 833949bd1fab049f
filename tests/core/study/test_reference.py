"""A study from a reference of the person's own: the search begins there, on every engine and register."""

from __future__ import annotations

import pytest

from thalweg.ansatz import UCCGSD, UCCSD, Adaptive, HardwareEfficient
from thalweg.errors import StudyError
from thalweg.study.run import run
from thalweg.study.spec import StudySpec, spec_from_data, with_setting
from thalweg.systems import Molecule

FOUR = StudySpec(system=Molecule(name="chain", atoms=tuple(("H", 0.0, 0.0, 1.5 * i) for i in range(4))))


@pytest.mark.parametrize(
    "ansatz", [UCCSD(), UCCGSD(), Adaptive(), Adaptive(pool="pauli-strings"), HardwareEfficient(start="zero")], ids=lambda a: a.key
)
@pytest.mark.parametrize("encoding", ["jordan-wigner", "parity"])
def test_the_search_begins_at_the_determinant(ansatz, encoding):
    spec = with_setting(FOUR.model_copy(update={"reference": "2020", "ansatz": ansatz}), "encoding", encoding)
    result = run(spec.model_copy(update={"stop": spec.stop.model_copy(update={"evaluations": 2})}))
    assert result.reference_name == "determinant 2020"
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
