"""Figures of a state on its lattice, against closed forms and against the energy that they add up to."""

import numpy as np
import pytest

from thalweg.errors import Stopped
from thalweg.study.problem import exact_answer, prepare
from thalweg.study.run import run
from thalweg.study.site_figures import exact_site_figures, site_figures
from thalweg.study.spec import HardwareEfficient, StudySpec
from thalweg.systems import LatticeModel
from thalweg.systems.hubbard import Hubbard
from thalweg.systems.lattice import Chain, Square
from thalweg.systems.spin_models import Heisenberg
from thalweg.watch import Watch


def exact_sites(system, **settings):
    problem = prepare(StudySpec(system=system, ansatz=HardwareEfficient(), **settings))
    return problem, site_figures(problem, exact_answer(problem).vectors)


@pytest.mark.parametrize("sites", [4, 6, 8])
def test_correlations_of_the_heisenberg_ring_add_up_to_its_energy(sites):
    problem, figures = exact_sites(LatticeModel(lattice=Chain(sites=sites)))
    spin = np.array(figures.spin_correlations)
    energy = sum(spin[i, (i + 1) % sites] for i in range(sites))
    assert energy == pytest.approx(exact_answer(problem).energy)
    assert np.diag(spin) == pytest.approx(0.75)
    assert spin.sum() == pytest.approx(0, abs=1e-9)  # total spin zero
    assert np.array(figures.z_correlations) * 3 == pytest.approx(spin, abs=1e-9)  # a singlet is the same along every axis
    assert figures.magnetisation == pytest.approx([0] * sites, abs=1e-9)


def test_the_structure_factor_of_an_antiferromagnet_peaks_at_pi_and_obeys_the_sum_rule():
    _, figures = exact_sites(LatticeModel(lattice=Chain(sites=8)))
    factor = {round(k, 6): s for k, _, s in figures.structure_factor}
    assert max(factor, key=factor.get) == pytest.approx(np.pi)
    assert factor[0.0] == pytest.approx(0, abs=1e-9)
    zone = [factor[round(2 * np.pi * m / 8, 6)] for m in (0, 1, 2, 3, 4, 3, 2, 1)]
    assert np.mean(zone) == pytest.approx(0.75)  # 1/N sum_k S(k) = S(S+1)


def test_a_two_dimensional_lattice_has_momenta_along_both_directions():
    _, figures = exact_sites(LatticeModel(lattice=Square(columns=2, rows=4)))
    assert any(abs(kx - np.pi) < 1e-6 and abs(abs(ky) - np.pi) < 1e-6 for kx, ky, _ in figures.structure_factor)


@pytest.mark.parametrize("orbitals", ["hopping", "site"])
def test_double_occupancy_of_the_hubbard_dimer(orbitals):
    # Closed form of the two-site model: E = U/2 - sqrt(U^2/4 + 4 t^2), and <n_up n_down> summed over sites = dE/dU.
    u = 4.0
    _, figures = exact_sites(LatticeModel(lattice=Chain(sites=2, periodic=False), model=Hubbard(u=u, orbitals=orbitals)))
    assert sum(figures.double_occupancy) == pytest.approx(0.5 - (u / 4) / np.sqrt(u**2 / 4 + 4))
    assert figures.double_occupancy[0] == pytest.approx(figures.double_occupancy[1])


def test_a_study_reports_the_trial_state_beside_the_exact_one():
    spec = StudySpec(system=LatticeModel(lattice=Chain(sites=4)), ansatz=HardwareEfficient(depth=4, start="uniform-random"), starts=3)
    result = run(spec)
    assert np.array(result.exact_sites.spin_correlations)[0, 1] == pytest.approx(-0.5)
    assert np.array(result.sites.spin_correlations)[0, 1] == pytest.approx(-0.5, abs=0.2)


def test_molecules_have_no_sites():
    from thalweg.systems import Molecule

    result = run(StudySpec(system=Molecule(atoms=(("H", 0, 0, 0), ("H", 0, 0, 0.74)))))
    assert result.sites is None


@pytest.mark.parametrize("model", [Heisenberg(), Hubbard()], ids=lambda model: model.key)
def test_figures_of_the_exact_state_are_kept_for_the_next_run_and_hear_a_stop(model):
    problem = prepare(StudySpec(system=LatticeModel(lattice=Chain(sites=6), model=model), ansatz=HardwareEfficient()))
    exact = exact_answer(problem)
    with pytest.raises(Stopped):
        exact_site_figures(problem, exact, Watch(should_stop=lambda: True))
    figures = exact_site_figures(problem, exact)
    assert figures == site_figures(problem, exact.vectors)
    assert exact_site_figures(problem, exact, Watch(should_stop=lambda: True)) is figures
