"""Files are opened by what they hold; each sample and each stored molecule is a system."""

import os
from pathlib import Path

import h5py
import numpy as np
import openfermion
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from support.exact import exact_energy

from thalweg.errors import StudyError
from thalweg.paths import data_folder
from thalweg.systems import Integrals, Molecule
from thalweg.systems.read_file import open_system
from thalweg.systems.samples import list_samples

STORED = sorted((Path(openfermion.__file__).parent / "testing" / "data").glob("*.hdf5"))
LISTING = "&FCI NORB=1,NELEC=2,MS2=0 /\n0.5 1 1 1 1\n-1.0 1 1 0 0\n0.1 0 0 0 0\n"
GEOMETRY = "2\nhydrogen\nH 0 0 0\nH 0 0 0.74\n"


def test_there_are_33_stored_molecules():
    assert len(STORED) == 33


@pytest.mark.parametrize("path", STORED, ids=lambda p: p.stem)
def test_stored_molecules_keep_their_stored_energies(path):
    """The files of the openfermion package store the energies that its authors computed."""
    system, _ = open_system(path)
    prepared, stored = system.prepare(), dict(system.stored_energies)
    assert isinstance(system, Integrals)
    assert prepared.reference_energy == pytest.approx(stored["HF"], abs=5e-8)
    assert exact_energy(prepared.fermions) == pytest.approx(stored["FCI"], abs=5e-8)
    assert prepared.facts["stored_energies"] == stored
    assert prepared.warnings == ()


def test_a_stored_molecule_says_what_it_is():
    system, notes = open_system(next(p for p in STORED if "Li" in p.name))
    assert system.name == "LiH, STO-3G"
    assert system.described == "Li 0 0 0; H 0 0 1.45; angstrom; sto-3g"
    assert system.source == "H1-Li1_sto-3g_singlet_1.45.hdf5"
    assert "HDF5" in notes[0]


@pytest.mark.parametrize("sample", list_samples(), ids=lambda s: s.file.name)
def test_every_sample_is_a_system_without_warnings(sample):
    system, notes = open_system(sample.file)
    prepared = system.prepare()
    assert prepared.spins is not None or prepared.fermions.sector.dimension >= 1
    assert prepared.warnings == ()
    assert system.name == sample.name or sample.file.suffix == ".toml"
    assert len(sample.description) > 20
    assert notes
    assert not any("?" in note for note in notes)


def test_the_samples_cover_the_small_molecules():
    names = {s.name for s in list_samples()}
    assert names >= {"H2", "LiH", "BeH2", "H2O", "NH3", "N2", "HF", "CH2", "H4_square", "H4_line", "H6_line", "H3+", "N2_6e6o"}
    assert "CH2" in names
    assert open_system(data_folder("sample_systems") / "CH2.xyz")[0].multiplicity == 3
    assert open_system(data_folder("sample_systems") / "H3+.xyz")[0].charge == 1


def test_the_listed_sample_is_the_molecule_it_was_made_from():
    listed = open_system(data_folder("sample_systems") / "N2_6e6o.fcidump")[0].prepare()
    made = open_system(data_folder("sample_systems") / "N2.xyz", active_space="6e,6o")[0].prepare()
    assert listed.reference_energy == pytest.approx(made.reference_energy, abs=1e-8)
    assert exact_energy(listed.fermions) == pytest.approx(exact_energy(made.fermions), abs=1e-8)


@pytest.mark.parametrize("name", ["a.xyz", "a.txt", "a", "A.XYZ", "a.dat"])
def test_geometries_are_known_by_content(tmp_path, name):
    (tmp_path / name).write_text(GEOMETRY)
    system, notes = open_system(tmp_path / name)
    assert isinstance(system, Molecule)
    assert system.atoms == (("H", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.74))
    assert any("0.7400 angstrom" in n for n in notes)


@pytest.mark.parametrize("name", ["FCIDUMP", "a.fcidump", "a.txt", "FCIDUMP.h2"])
def test_listings_are_known_by_content(tmp_path, name):
    (tmp_path / name).write_text(LISTING)
    system, _ = open_system(tmp_path / name)
    assert isinstance(system, Integrals)
    assert system.prepare().reference_energy == pytest.approx(0.1 - 2.0 + 0.5)


def test_other_encodings_are_read(tmp_path):
    (tmp_path / "a.xyz").write_bytes("2\nwater \xe9\nH 0 0 0\nH 0 0 0.74".encode("latin-1"))
    (tmp_path / "b.xyz").write_bytes(GEOMETRY.encode("utf-16"))
    assert len(open_system(tmp_path / "a.xyz")[0].atoms) == len(open_system(tmp_path / "b.xyz")[0].atoms) == 2


@pytest.mark.parametrize("content", [GEOMETRY, LISTING])
def test_bytes_of_a_name_that_are_no_text_become_question_marks(tmp_path, content):
    path = tmp_path / os.fsdecode(b"gr\xfcn.xyz")
    try:
        path.write_text(content)
    except OSError:
        return  # this system has no such names
    system, _ = open_system(path)
    assert system.name == "gr?n"
    system.model_dump_json()


def test_overrides_win_over_the_file(tmp_path):
    path = tmp_path / "ion.xyz"
    path.write_text("1\ncharge=1 multiplicity=2\nO 0 0 0")
    system, _ = open_system(path, charge=0, multiplicity=3, basis="6-31g", cartesian=None)
    assert (system.charge, system.multiplicity, system.basis, system.cartesian) == (0, 3, "6-31g", False)
    assert open_system(path, unit="bohr")[0].unit == "bohr"
    assert open_system(path)[0].charge == 1


@pytest.mark.parametrize(
    ("overrides", "field"),
    [({"charge": 99}, "system.charge"), ({"multiplicity": "many"}, "system.multiplicity"), ({"listing": "x"}, "system.listing")],
)
def test_overrides_that_cannot_be_are_refused(tmp_path, overrides, field):
    (tmp_path / "a.xyz").write_text(GEOMETRY)
    with pytest.raises(StudyError) as caught:
        open_system(tmp_path / "a.xyz", **overrides)
    assert caught.value.field == field


def test_a_charge_cannot_be_set_for_integrals(tmp_path):
    (tmp_path / "FCIDUMP").write_text(LISTING)
    with pytest.raises(StudyError, match="charge"):
        open_system(tmp_path / "FCIDUMP", charge=1)


@pytest.mark.parametrize(
    ("content", "word"),
    [
        (b"", "empty"),
        (b" \n\n", "empty"),
        (b"PK\x03\x04\x00\x00\x01", "binary"),
        (b"%PDF-1.4 hello", "no system that can be read"),
        (b"\x89HDF\r\n\x1a\n broken", "HDF5"),
        (b"&FCI NORB=2", "no end"),
    ],
)
def test_files_that_are_no_system_are_refused(tmp_path, content, word):
    (tmp_path / "thing.pdf").write_bytes(content)
    with pytest.raises(StudyError, match=word):
        open_system(tmp_path / "thing.pdf")


def test_missing_files_folders_and_impossible_names_are_refused(tmp_path):
    for path, word in ((tmp_path / "none.xyz", "no file"), (tmp_path, "folder"), ("bad\0name", "cannot be opened")):
        with pytest.raises(StudyError, match=word):
            open_system(path)


def _molecular_data(path, **changes):
    data = {
        "one_body_integrals": np.array([[-1.0, 0.0], [0.0, -0.5]]),
        "two_body_integrals": np.zeros((2, 2, 2, 2)),
        "nuclear_repulsion": 0.7,
        "n_electrons": 2,
        "multiplicity": 1,
    } | changes
    with h5py.File(path, "w") as file:
        for key, value in data.items():
            if value is not None:
                file[key] = value
    return path


@pytest.mark.parametrize(
    "changes",
    [
        {"one_body_integrals": None},
        {"two_body_integrals": False},
        {"two_body_integrals": np.zeros((3, 3, 3, 3))},
        {"two_body_integrals": np.random.default_rng(1).normal(size=(2, 2, 2, 2))},
        {"one_body_integrals": np.zeros((2, 3))},
        {"one_body_integrals": np.zeros((2, 2), complex)},
        {"one_body_integrals": np.full((2, 2), np.nan)},
        {"nuclear_repulsion": "much"},
        {"n_electrons": np.array([1, 2])},
        {"n_electrons": None},
    ],
)
def test_hdf5_without_fitting_integrals_is_refused(tmp_path, changes):
    with pytest.raises(StudyError, match="HDF5 molecular data"):
        open_system(_molecular_data(tmp_path / "a.h5", **changes))


def test_hdf5_without_geometry_or_orbital_energies_is_a_system(tmp_path):
    prepared = open_system(_molecular_data(tmp_path / "a.h5"))[0].prepare()
    assert prepared.reference_energy == pytest.approx(0.7 - 2.0)
    assert prepared.label == "a"


@settings(max_examples=100, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.binary(max_size=200) | st.tuples(st.integers(0, 2000), st.binary(min_size=1, max_size=8)))
def test_any_bytes_give_a_system_or_a_sentence(tmp_path, content):
    if isinstance(content, tuple):  # a stored molecule with some bytes overwritten
        whole = bytearray(STORED[1].read_bytes())
        whole[content[0] : content[0] + len(content[1])] = content[1]
        content = bytes(whole)
    (tmp_path / "x").write_bytes(content)
    try:
        system, _ = open_system(tmp_path / "x")
    except StudyError:
        return
    assert isinstance(system, Molecule | Integrals)
