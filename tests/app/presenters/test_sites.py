"""Tables of a state on its lattice. Numbers are invented and stand for a ring of four spins."""

import numpy as np
import pytest
import studies

from thalweg.study.result import SiteFigures
from thalweg.study.spec import HardwareEfficient, StudySpec
from thalweg.systems import LatticeModel
from thalweg.systems.hubbard import Hubbard
from thalweg.systems.lattice import Chain
from thalweg_app.presenters.sites import bond_correlations, graph_of, lists_of, site_values, sites_table_of

SPIN = 0.75 * np.eye(4) - 0.5 * (np.roll(np.eye(4), 1, axis=0) + np.roll(np.eye(4), -1, axis=0))


def rows(matrix):
    return tuple(tuple(float(v) for v in row) for row in matrix)


@pytest.fixture
def ring():
    spec = StudySpec(system=LatticeModel(lattice=Chain(sites=4)), ansatz=HardwareEfficient())
    sites = SiteFigures(
        magnetisation=(0.1, -0.1, 0.1, -0.1),
        z_correlations=rows(SPIN / 3),
        spin_correlations=rows(SPIN),
        structure_factor=((0.0, 0.0, 0.0), (np.pi, 0.0, 1.75)),
    )
    return studies.result(spec=spec).model_copy(update={"sites": sites, "exact_sites": None})


def test_a_molecule_has_only_its_weights():
    assert lists_of(studies.result()) == ["weights"]
    assert lists_of(None) == ["weights"]
    assert graph_of(studies.result()) is None
    assert bond_correlations(studies.result()) == {}


def test_spins_offer_correlations_structure_and_sites(ring):
    assert lists_of(ring) == ["weights", "correlations", "structure", "sites"]
    table = sites_table_of(ring, "correlations")
    assert len(table.rows) == 6
    assert table.rows[0][:3] == ("0 – 1", "nearest", "−0.50000")
    assert table.rows[0][3] == "–"  # no exact state
    assert sites_table_of(ring, "structure").rows[1][0] == "3.1416"
    assert sites_table_of(ring, "sites").rows[1][2] == "−0.10000"


def test_bonds_carry_their_correlations(ring):
    values = bond_correlations(ring)
    assert len(values) == 4
    assert set(values.values()) == {-0.5}
    assert site_values(ring) == (0.1, -0.1, 0.1, -0.1)


def test_the_exact_state_stands_beside_the_trial_state(ring):
    both = ring.model_copy(update={"exact_sites": ring.sites})
    assert sites_table_of(both, "correlations").rows[0][3] == "−0.50000"
    assert sites_table_of(both, "structure").rows[1][3] == "+1.75000"


def test_electrons_show_double_occupancy():
    spec = StudySpec(system=LatticeModel(lattice=Chain(sites=2, periodic=False), model=Hubbard()))
    result = studies.result(spec=spec).model_copy(update={"sites": SiteFigures(double_occupancy=(0.1, 0.1))})
    assert lists_of(result) == ["weights", "sites"]
    assert sites_table_of(result, "sites").header[2] == "⟨n↑ n↓⟩"
    assert site_values(result) == (0.1, 0.1)
