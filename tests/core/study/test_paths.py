"""Every path moves the study to the value asked for, and refuses what does not fit in one sentence."""

import numpy as np
import pytest

from thalweg.errors import StudyError
from thalweg.study.path import PATHS, AnglePath, BondPath, BreathePath, DihedralPath, FramesPath, SettingPath, StretchPath
from thalweg.study.path.base import positions_of
from thalweg.study.scan_spec import ScanSpec, geometric_points, linear_points, read_points
from thalweg.study.spec import StudySpec
from thalweg.systems import Integrals, Molecule
from thalweg.systems.displacement import angle_degrees, dihedral_degrees

WATER = StudySpec(system=Molecule(atoms=(("O", 0.0, 0.0, 0.0), ("H", 0.96, 0.0, 0.0), ("H", -0.24, 0.93, 0.0))))
CHAIN = StudySpec(system=Molecule(atoms=tuple(("H", 0.0, 0.0, float(i)) for i in range(6))))
SQUARE = StudySpec(system=Molecule(atoms=(("H", 0, 0, 0), ("H", 0.9, 0, 0), ("H", 0.9, 0.9, 0), ("H", 0, 0.9, 0))))
PEROXIDE = StudySpec(system=Molecule(atoms=(("H", 1.0, 0.9, 0.0), ("O", 0.7, 0.0, 0.0), ("O", -0.7, 0.0, 0.0), ("H", -1.0, 0.0, 0.9))))


def distances(spec):
    r = positions_of(spec.system)
    return np.linalg.norm(r[:, None] - r[None], axis=-1)


def test_a_bond_stretches_and_the_smaller_fragment_moves():
    out = BondPath(first=2, second=3).at(PEROXIDE, 2.0)
    before, after = positions_of(PEROXIDE.system), positions_of(out.system)
    assert distances(out)[1, 2] == pytest.approx(2.0)
    assert distances(out)[2, 3] == pytest.approx(distances(PEROXIDE)[2, 3])
    assert np.array_equal(before[:2], after[:2])
    water = BondPath(first=2, second=1).at(WATER, 1.4)
    assert positions_of(water.system)[0].tolist() == [0, 0, 0]  # the hydrogen moves, not the rest


def test_a_symmetric_stretch_gives_all_bonds_one_length():
    water = StretchPath(bonds="1-2,1-3").at(WATER, 1.3)
    assert distances(water)[0, 1:] == pytest.approx([1.3, 1.3])
    assert angle_degrees(positions_of(water.system), 1, 0, 2) == pytest.approx(angle_degrees(positions_of(WATER.system), 1, 0, 2))
    chain = StretchPath(bonds="1-2,2-3,3-4,4-5,5-6").at(CHAIN, 1.7)
    assert np.diag(distances(chain), 1) == pytest.approx([1.7] * 5)


def test_angle_dihedral_breathing_and_frames():
    assert angle_degrees(positions_of(AnglePath(first=2, vertex=1, last=3).at(WATER, 120).system), 1, 0, 2) == pytest.approx(120)
    assert dihedral_degrees(positions_of(DihedralPath().at(PEROXIDE, 35.0).system), 0, 1, 2, 3) == pytest.approx(35.0)
    assert distances(BreathePath().at(SQUARE, 2.0))[0, 1] == pytest.approx(1.8)
    frame = tuple(tuple(float(v) for v in row) for row in positions_of(CHAIN.system) * 1.1)
    assert distances(FramesPath(frames=(frame,)).at(CHAIN, 1))[0, 1] == pytest.approx(1.1)


def test_any_numeric_setting_can_be_varied():
    assert SettingPath(setting="target.error").at(WATER, 0.01).target.error == 0.01
    assert SettingPath(setting="starts").at(WATER, 3.0).starts == 3


@pytest.mark.parametrize(
    ("path", "spec", "value", "word"),
    [
        (BondPath(first=1, second=9), WATER, 1.0, "no atom 9"),
        (BondPath(first=2, second=2), WATER, 1.0, "named twice"),
        (BondPath(), StudySpec(system=Integrals(listing="x")), 1.0, "needs a geometry"),
        (StretchPath(bonds="1-2,2-3,3-4,4-1"), SQUARE, 1.0, "ring"),
        (StretchPath(bonds="one-two"), WATER, 1.0, "Cannot read the bonds"),
        (BreathePath(), WATER, 0.0, "not positive"),
        (FramesPath(), WATER, 1, "no frame"),
        (SettingPath(setting="ansatz.start"), WATER, 1.0, "not a number"),
        (SettingPath(setting="nothing.here"), WATER, 1.0, "not a number"),
        (SettingPath(setting="starts"), WATER, 1.5, "whole number"),
    ],
)
def test_what_does_not_fit_is_refused_in_one_sentence(path, spec, value, word):
    with pytest.raises(StudyError) as error:
        path.at(spec, value)
    assert word in str(error.value)


def test_every_path_is_titled_and_round_trips_through_a_scan():
    for cls in PATHS:
        scan = ScanSpec(study=WATER, path=cls(), points=(1.0, 0.9))
        assert cls.title
        assert cls.about
        assert ScanSpec.model_validate_json(scan.model_dump_json()) == scan
        assert hash(scan) == hash(ScanSpec.model_validate_json(scan.model_dump_json()))


def test_points_are_sorted_and_unique_and_ranges_are_checked():
    assert ScanSpec(study=WATER, points=(2.0, 1.0, 2.0)).points == (1.0, 2.0)
    assert linear_points(0.6, 1.0, 5) == (0.6, 0.7, 0.8, 0.9, 1.0)
    assert geometric_points(1.0, 4.0, 3) == (1.0, 2.0, 4.0)
    assert read_points("0.6, 0.7 1e0") == (0.6, 0.7, 1.0)
    for bad in (lambda: linear_points(1, 1, 5), lambda: linear_points(1, 2, 1), lambda: geometric_points(-1, 1, 3), lambda: read_points("a b")):
        with pytest.raises(StudyError):
            bad()
