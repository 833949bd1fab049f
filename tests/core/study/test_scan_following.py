"""Orbitals are followed from one geometry to the next: the same ones, in the same order, with the same signs."""

from dataclasses import replace

import numpy as np
import pytest

from thalweg.study.executors import InProcess
from thalweg.study.path import StretchPath
from thalweg.study.scan import run_scan
from thalweg.study.scan_mean_fields import curve_fields
from thalweg.study.scan_spec import ScanSpec, linear_points
from thalweg.study.spec import Molecule, StudySpec
from thalweg.systems.orbital_following import as_told
from thalweg.watch import SILENT


def nitrogen(distance, **settings):
    return Molecule(name="N2", atoms=(("N", 0.0, 0.0, 0.0), ("N", 0.0, 0.0, distance)), **settings)


def test_orbitals_keep_their_order_where_their_energies_cross():
    alone = [nitrogen(r).prepare() for r in (0.9, 1.1, 1.3)]  # a sigma orbital passes the pi orbitals on the way
    assert len({tuple(p.fermions.orbital_irreps.tolist()) for p in alone}) == 3
    seed = alone[0].seed
    for r in (1.1, 1.3):
        followed = nitrogen(r).prepare(neighbour=seed)
        assert followed.fermions.orbital_irreps.tolist() == alone[0].fermions.orbital_irreps.tolist()
        assert followed.facts["active_orbital_order"] == [p + 1 for p in followed.seed.active]
        overlap = np.sum(seed.orbitals[:, seed.active] * followed.seed.orbitals[:, followed.seed.active], axis=0)
        assert (overlap > 0.7).all()
        seed = followed.seed
    assert followed.fermions.reference_energy == pytest.approx(alone[2].fermions.reference_energy, abs=1e-9)
    not_followed = nitrogen(1.3).prepare(neighbour=replace(alone[0].seed, follow=False))
    assert not_followed.fermions.orbital_irreps.tolist() == alone[2].fermions.orbital_irreps.tolist()
    assert "active_orbital_order" not in not_followed.facts


def test_an_open_shell_is_followed_too():
    def radical(r):
        return Molecule(atoms=(("N", 0.0, 0.0, 0.0), ("O", 0.0, 0.0, r)), multiplicity=2, active_space="frozen-core")

    first = radical(1.15).prepare()
    second = radical(1.25).prepare(neighbour=first.seed)
    assert second.fermions.sector == first.fermions.sector
    overlap = np.sum(first.seed.orbitals[:, first.seed.active] * second.seed.orbitals[:, second.seed.active], axis=0)
    assert (overlap > 0.7).all()
    assert second.fermions.reference_energy == pytest.approx(radical(1.25).prepare().fermions.reference_energy, abs=1e-8)


def test_a_symmetric_stretch_of_water_is_smooth_through_its_crossings():
    water = StudySpec(system=Molecule(atoms=(("O", 0, 0, 0), ("H", 0, 0.7572, 0.5865), ("H", 0, -0.7572, 0.5865)), active_space="frozen-core"))
    result = run_scan(ScanSpec(study=water, path=StretchPath(bonds="1-2,1-3"), points=linear_points(1.2, 2.2, 11)), InProcess)
    errors = np.array([p.result.error for p in result.points])
    third = np.abs(np.diff(errors, 3))
    assert third.max() < 0.1 * np.ptp(errors)  # an error that jumped would show fully in its third differences
    assert all(set(p.flags) <= {"retried"} for p in result.points)


def test_the_mean_fields_of_a_curve_are_followed_once_and_known_to_its_points():
    scan = ScanSpec(study=StudySpec(system=nitrogen(1.1, active_space="6e,6o")), points=(1.0, 1.1, 1.2, 1.6))
    fields = curve_fields(scan, SILENT)
    assert all(field is not None for field in fields)
    for field, value in zip(fields, scan.points, strict=True):
        again = scan.at(value).system.prepare(neighbour=replace(field.seed, here=True))
        assert again.seed.energy == pytest.approx(field.seed.energy, abs=1e-9)
        assert again.seed.stability == field.seed.stability
        assert again.facts["mean_field_iterations"] < 5
        assert again.seed.active == field.seed.active
    everything = scan.model_copy(update={"study": StudySpec(system=nitrogen(1.1))})
    assert curve_fields(everything, SILENT) == [None] * 4


def test_a_broken_point_group_is_told_at_every_point_but_worked_out_once():
    far = nitrogen(2.0).prepare()
    assert any("mEh lower breaks the point group" in text for text in far.warnings)
    next_one = nitrogen(2.05).prepare(neighbour=far.seed)
    assert any("A lower mean field breaks the point group D2h, as at the neighbouring geometry" in text for text in next_one.warnings)
    assert next_one.fermions.reference_energy == pytest.approx(nitrogen(2.05).prepare().fermions.reference_energy, abs=1e-8)


def test_a_resumed_scan_goes_on_in_the_order_and_with_the_signs_of_the_points_it_has():
    scan = ScanSpec(study=StudySpec(system=nitrogen(1.1, active_space="3-9")), points=linear_points(0.9, 1.5, 7))
    whole = run_scan(scan, InProcess)
    kept = whole.points[:4]
    assert "active_orbital_order" in kept[3].result.system_facts  # the order is not that of the energies there
    resumed = run_scan(scan, InProcess, done=kept)
    assert [p.result.energy for p in resumed.points] == pytest.approx([p.result.energy for p in whole.points], abs=1e-8)
    assert [p.result.parameter_labels for p in resumed.points] == [p.result.parameter_labels for p in whole.points]


def test_what_is_told_of_order_and_signs_brings_back_the_seed():
    first = nitrogen(0.9).prepare()
    followed = nitrogen(1.3).prepare(neighbour=nitrogen(1.1).prepare(neighbour=first.seed).seed)
    again = as_told(nitrogen(1.3).prepare().seed, followed.facts)
    assert again.active == followed.seed.active
    assert np.allclose(again.orbitals, followed.seed.orbitals, atol=1e-5)
