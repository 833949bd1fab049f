"""Lattice files: every sample, round trips, refusals in words."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from thalweg.errors import StudyError
from thalweg.paths import data_folder
from thalweg.systems.bond_list import BondList
from thalweg.systems.lattice import LATTICES, Chain
from thalweg.systems.lattice_file import lattice_description, read_lattice_file, write_lattice_file
from thalweg.systems.lattice_model import MODELS, LatticeModel
from thalweg.systems.read_file import open_system
from thalweg.systems.spin_models import Heisenberg, Ising

SAMPLES = sorted(data_folder("sample_systems").glob("*.toml"))
RING = '[lattice]\nkey = "chain"\nsites = 6\n[model]\nkey = "ising"\ntransverse = 0.5\n'


@pytest.mark.parametrize("path", SAMPLES, ids=lambda p: p.stem)
def test_every_sample_opens_prepares_and_says_what_it_is(path):
    system, notes = open_system(path)
    assert isinstance(system, LatticeModel)
    prepared = system.prepare()
    assert prepared.label == system.name
    assert notes == (f"Read '{path.name}' as a lattice file",)
    assert len(lattice_description(path.read_text())) > 30
    assert "convention" in prepared.facts


def test_the_samples_cover_what_they_should():
    names = {path.stem for path in SAMPLES}
    assert names >= {"ring_8_heisenberg", "ring_12_heisenberg", "square_16_j1j2", "kagome_12", "triangular_12", "honeycomb_8_kitaev"}
    assert names >= {"hubbard_dimer", "hubbard_plaquette", "hubbard_ring_6", "river_crews_cut"}
    fields = {system.model.transverse for system in (open_system(p)[0] for p in SAMPLES) if isinstance(system.model, Ising)}
    assert fields == {0.5, 1.0, 2.0}


def test_invented_data_says_so():
    cut = open_system(data_folder("sample_systems") / "river_crews_cut.toml")[0]
    assert "invented" in cut.name
    assert "Invented" in cut.prepare().facts["note"]


def test_fields_left_out_take_their_defaults():
    assert read_lattice_file(RING) == LatticeModel(lattice=Chain(sites=6), model=Ising(transverse=0.5))
    assert read_lattice_file("\ufeff" + RING.replace("\n", "\r\n")) == read_lattice_file(RING)


@pytest.mark.parametrize("lattice", list(LATTICES), ids=lambda c: c.model_fields["key"].default)
@pytest.mark.parametrize("model", list(MODELS), ids=lambda c: c.model_fields["key"].default)
def test_what_is_written_is_read_back(lattice, model):
    system = LatticeModel(name="a", lattice=lattice(), model=model(), reference="bits", bits="01")
    assert read_lattice_file(write_lattice_file(system)) == system


texts = st.text(st.characters(exclude_categories=("Cs",)), max_size=30)


@given(texts, texts, texts, st.floats(allow_nan=False, allow_infinity=False))
def test_any_words_and_numbers_survive_writing(name, note, bonds, j):
    system = LatticeModel(name=name, note=note, lattice=BondList(bonds=bonds), model=Heisenberg(j=j))
    assert read_lattice_file(write_lattice_file(system)) == system


@given(st.text(max_size=80) | st.text("[]latticemodkey='\"\n=.0", max_size=60))
def test_any_text_is_read_or_refused_in_words(text):
    with pytest.raises(StudyError) as caught:
        read_lattice_file(text)
    assert caught.value.what
    assert caught.value.fix


@pytest.mark.parametrize(
    ("text", "what", "field"),
    [
        ("x = [", "not TOML", ""),
        ("", r"no table \[lattice\]", "lattice"),
        ('[lattice]\nkey = "chain"\n', r"no table \[model\]", "model"),
        (RING.replace('key = "chain"', 'key = "chian"'), "'chian' is none of the kinds", "lattice.key"),
        (RING.replace('key = "ising"\n', ""), "it has no `key`", "model.key"),
        (RING.replace("sites", "sits"), "unknown field 'lattice.sits'", "lattice.sits"),
        (RING.replace("sites = 6", "sites = 0"), "greater than or equal to 1", "lattice.sites"),
        (RING.replace("0.5", '"much"'), "valid number", "model.transverse"),
        ("colour = 1\n" + RING, "unknown field 'colour'", "colour"),
        ('reference = "none"\n' + RING, "'none'", "reference"),
        ("lattice = 3\n", r"no table \[lattice\]", "lattice"),
    ],
)
def test_a_wrong_file_is_refused_in_words(text, what, field):
    with pytest.raises(StudyError, match=what) as caught:
        read_lattice_file(text)
    assert caught.value.field == field


def test_edge_lists_open_with_the_heisenberg_model(tmp_path):
    (tmp_path / "weirs.csv").write_text("site,site,weight\n0,1,2\n1,2,0.5\n")
    system, notes = open_system(tmp_path / "weirs.csv")
    assert system == LatticeModel(name="weirs", lattice=BondList(bonds="0 1 2.0 nearest\n1 2 0.5 nearest"))
    assert "edge list" in notes[0]
    (tmp_path / "weirs.toml").write_text("bonds = [[0, 1, 2], [1, 2, 0.5]]")
    assert open_system(tmp_path / "weirs.toml")[0].lattice == system.lattice
