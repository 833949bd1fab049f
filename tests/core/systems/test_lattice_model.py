"""A lattice model as a system: labels, units, facts, and no heavy imports."""

from __future__ import annotations

import json
import subprocess
import sys

import pytest

from thalweg.errors import Stopped
from thalweg.study.spec import StudySpec, with_setting
from thalweg.systems import SYSTEMS
from thalweg.systems.clauses import Clauses
from thalweg.systems.lattice import Chain, Kagome, Square, Unconnected
from thalweg.systems.lattice_model import MODELS, LatticeModel
from thalweg.systems.pauli_list import PauliList
from thalweg.systems.spin_models import J1J2, Heisenberg, Ising
from thalweg.watch import Watch


def test_facts_say_what_is_counted_and_in_which_convention():
    facts = LatticeModel(lattice=Chain(sites=2), note="ours").prepare().facts
    assert facts["sites"] == 2
    assert facts["bonds"] == "1 nearest"
    assert facts["bond weights"] == "2"
    assert "as often as it is met" in facts["what is counted"]
    assert "S = sigma/2" in facts["convention"]
    assert "antiparallel" in facts["convention"]
    assert facts["conserved"] == "total spin S, S_z"
    assert facts["reference energy per site"] == pytest.approx(-0.25)
    assert facts["note"] == "ours"
    assert json.loads(json.dumps(facts)) == facts


def test_second_neighbours_are_told_only_where_they_count():
    assert LatticeModel(lattice=Chain(sites=4)).prepare().facts["bonds"] == "4 nearest"
    facts = LatticeModel(lattice=Chain(sites=4), model=J1J2()).prepare().facts
    assert facts["bonds"] == "4 nearest, 2 second"
    assert "class second" in facts["what is counted"]


def test_the_unit_is_the_coupling_only_while_it_is_one():
    assert LatticeModel().energy_unit() == "J"
    assert LatticeModel(model=J1J2(j1=-1)).energy_unit() == "J1"
    assert LatticeModel(model=Heisenberg(j=2)).energy_unit() == "units of J = 1"


def test_labels_come_from_the_name_or_from_model_and_lattice():
    assert LatticeModel(name="my ring").prepare().label == "my ring"
    assert LatticeModel(lattice=Chain(sites=6), model=Ising()).prepare().label == "Ising, ring of 6 sites"


def test_models_with_sites_of_their_own_show_them():
    assert LatticeModel(lattice=Unconnected(), model=Clauses(clauses="rain or not sun")).graph().site_names == ("rain", "sun")
    assert LatticeModel(lattice=Unconnected(), model=PauliList(terms="Z3")).graph().n_sites == 4


def test_translations_go_with_the_system():
    assert LatticeModel(lattice=Square(columns=2, rows=3)).prepare().translations == Square(columns=2, rows=3).build().translations


def test_preparing_stops_when_asked_to():
    with pytest.raises(Stopped):
        LatticeModel().prepare(Watch(should_stop=lambda: True))


def test_settings_reach_lattice_and_model_by_their_paths():
    spec = StudySpec(system=LatticeModel())
    assert with_setting(spec, "system.lattice.sites", "12").system.lattice == Chain(sites=12)
    kagome = with_setting(spec, "system.lattice", "kagome")
    assert kagome.system.lattice == Kagome()
    assert with_setting(kagome, "system.model", "ising").system.model == Ising()
    assert with_setting(kagome, "system.model.field", "0.5").system.model == Heisenberg(field=0.5)


@pytest.mark.parametrize("model", list(MODELS), ids=lambda c: c.model_fields["key"].default)
def test_every_model_round_trips_through_json(model):
    system = LatticeModel(model=model())
    assert LatticeModel.model_validate_json(system.model_dump_json()) == system
    assert hash(system) == hash(LatticeModel(model=model()))
    assert model.title
    assert model.about


def test_the_settings_load_no_numerics():
    code = "import sys, thalweg.systems.lattice_model; print([m for m in ('scipy', 'numba', 'pyscf', 'openfermion', 'h5py') if m in sys.modules])"
    assert subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout.strip() == "[]"


def test_it_is_a_kind_of_system():
    assert SYSTEMS.get("lattice") is LatticeModel
