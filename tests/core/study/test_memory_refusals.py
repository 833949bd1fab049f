"""Every part of a study that could take much memory says what it needs and is refused past the budget, before it is taken."""

from __future__ import annotations

import pytest

from thalweg.ansatz import HardwareEfficient
from thalweg.errors import StudyError
from thalweg.study.assemble import exact_vectors
from thalweg.study.figures import inspect
from thalweg.study.problem import exact_answer, prepare
from thalweg.study.run import run
from thalweg.study.spec import StudySpec
from thalweg.systems import LatticeModel, Molecule
from thalweg.systems.lattice import Chain

MIB = 1.0 / 1024


def hydrogen(atoms: int) -> Molecule:
    return Molecule(atoms=tuple(("H", 0.0, 0.0, 0.9 * i) for i in range(atoms)))


@pytest.mark.parametrize(
    ("study", "mib", "what"),
    [
        ({"system": hydrogen(8)}, 0.05, "integrals"),
        ({"system": hydrogen(8)}, 0.4, "spin orbitals"),
        ({"system": hydrogen(8)}, 3.0, "trial state"),
        ({"system": LatticeModel(lattice=Chain(sites=12)), "ansatz": HardwareEfficient()}, 0.1, "register"),
    ],
)
def test_an_inspection_is_refused_with_what_is_needed_and_allowed(study, mib, what):
    with pytest.raises(StudyError, match=what) as refused:
        inspect(StudySpec(**study, memory_gib=mib * MIB))
    assert "GiB" in refused.value.why


def test_the_memory_of_the_exact_energy_is_stated_and_its_refusal_foretold():
    spec = StudySpec(system=hydrogen(8), memory_gib=8.0 * MIB)
    figures = inspect(spec)
    assert figures.memory_bytes < 8 * 2**20 < figures.exact_bytes
    assert any("exact energy needs" in text for text in figures.warnings)
    with pytest.raises(StudyError, match="exact energy"):
        run(spec)
    silent = inspect(spec.model_copy(update={"exact": False}))
    assert not any("exact energy needs" in text for text in silent.warnings)


def test_ground_states_that_do_not_fit_on_the_register_leave_the_fidelity_out_and_say_so():
    spec = StudySpec(system=LatticeModel(lattice=Chain(sites=8)), ansatz=HardwareEfficient(depth=1))
    problem = prepare(spec)
    exact = exact_answer(problem)
    vectors, remarks = exact_vectors(problem, exact)
    assert vectors is not None
    assert remarks == ()
    tight = problem.__class__(**{**vars(problem), "spec": spec.model_copy(update={"memory_gib": 1.0 / 2**20})})
    vectors, remarks = exact_vectors(tight, exact)
    assert vectors is None
    assert "memory budget" in remarks[0]
