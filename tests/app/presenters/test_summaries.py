import pytest
import studies

from thalweg.encoding import JordanWigner
from thalweg.systems import LatticeModel, Molecule
from thalweg.systems.hubbard import Hubbard
from thalweg.systems.lattice import Chain
from thalweg_app.presenters.summaries import formula, summary, system_label


@pytest.mark.parametrize(
    ("section", "line"),
    [
        ("system", "LiH, STO-3G: 4 electrons in 6 orbitals"),
        ("encoding", "Jordan-Wigner, tapered: 12 → 10 qubits, 631 terms"),
        ("ansatz", "UCCSD: 44 parameters, 1,216 two-qubit gates"),
        ("optimizer", "L-BFGS-B: 1 start, target 1.59 mEh"),
    ],
)
def test_a_folded_section_says_what_is_chosen_and_what_it_costs(section, line):
    assert summary(section, studies.study(), studies.figures()) == line


@pytest.mark.parametrize(
    ("section", "line"),
    [
        ("system", "LiH, STO-3G"),
        ("encoding", "Jordan-Wigner, tapered"),
        ("ansatz", "UCCSD"),
        ("optimizer", "L-BFGS-B: 1 start, target 1.59 mEh"),
    ],
)
def test_figures_that_are_not_known_are_left_out(section, line):
    assert summary(section, studies.study(), None) == line


def test_without_tapering_one_number_of_qubits_is_shown():
    spec = studies.study(encoding=JordanWigner(taper=False))
    assert summary("encoding", spec, studies.figures(qubits=12)) == "Jordan-Wigner, not tapered: 12 qubits, 631 terms"


@pytest.mark.parametrize(("symbols", "text"), [(["H", "O", "H"], "H2O"), (["H", "C", "H", "O"], "CH2O"), (["Li", "H"], "HLi"), (["N", "N"], "N2")])
def test_formulas_follow_hill_order(symbols, text):
    # Hill order: carbon, then hydrogen, then the alphabet; the alphabet alone without carbon (common practice)
    assert formula(tuple((s, 0.0, 0.0, float(i)) for i, s in enumerate(symbols))) == text


def test_a_molecule_without_a_name_is_called_by_its_formula():
    spec = studies.study(system=Molecule(atoms=(("H", 0, 0, 0), ("H", 0, 0, 0.7)), basis="cc-pvdz"))
    assert system_label(spec) == "H2, cc-pvdz"


def test_spins_need_no_encoding():
    spec = studies.study(system=LatticeModel())
    assert summary("encoding", spec, studies.figures(qubits=8, qubits_before_tapering=8)) == "every site is a qubit: 8 qubits, 631 terms"
    assert summary("encoding", studies.study(system=LatticeModel(model=Hubbard(), lattice=Chain(sites=4))), None) == "Jordan-Wigner, tapered"
