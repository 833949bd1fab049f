"""A scan over the frames of a file, set up without a screen. Geometries are invented."""

import pytest
import studies
from fake_starter import FakeStarter

from thalweg.study.path import FramesPath
from thalweg_app.presenters.scan_control import ScanControl


def frames(*distances, symbols=("Li", "H")):
    return "".join(f"2\nframe\n{symbols[0]} 0 0 0\n{symbols[1]} 0 0 {r}\n" for r in distances)


@pytest.fixture
def study():
    return [studies.study()]


@pytest.fixture
def scans(study):
    made = ScanControl(FakeStarter(), lambda: study[0])
    made.sentences = []
    made.told.connect(made.sentences.append)
    return made


def follow(scans, tmp_path, text, name="stretch.xyz"):
    (tmp_path / name).write_text(text)
    scans.open_frames(tmp_path / name)


def test_every_frame_is_a_point(scans, tmp_path):
    follow(scans, tmp_path, frames(1.4, 1.6, 1.9))
    assert scans.frames_told == "stretch.xyz: 3 frames, read in ångström"
    assert scans.spec().points == (1.0, 2.0, 3.0)
    assert scans.spec().at(3.0).system.atoms[1] == ("H", 0.0, 0.0, 1.9)
    scans.start()
    assert len(scans.live.spec.path.frames) == 3


def test_some_frames_alone_are_run(scans, tmp_path):
    follow(scans, tmp_path, frames(1.4, 1.6, 1.9))
    scans.edit("among_frames", "3, 1")
    assert scans.spec().points == (1.0, 3.0)
    for wrong in ("4", "0", "1.5"):
        scans.edit("among_frames", wrong)
        assert f"There is no frame {wrong}: frames are numbered 1 to 3" in scans.obstacle


def test_without_a_file_the_form_says_what_is_missing(scans):
    scans.choose_path("frames")
    assert "No frames are chosen" in scans.obstacle
    assert scans.frames_told == "No file chosen"


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        (frames(1.4, 1.6) + frames(0.9, symbols=("F", "H")), "Frame 3 of stretch.xyz has other atoms: it holds F H, the molecule Li H"),
        (frames(1.4, symbols=("H", "Li")) + frames(1.6), "Frame 1 of stretch.xyz has other atoms"),
        (frames(1.4), "stretch.xyz holds one geometry"),
        ("", "There is no geometry"),
        ("two atoms\n", "Atom 1, 'two atoms', cannot be read"),
    ],
)
def test_frames_that_do_not_fit_are_refused_in_a_sentence(scans, tmp_path, text, sentence):
    follow(scans, tmp_path, text)
    assert sentence in scans.obstacle
    assert scans.frames_told == "stretch.xyz"
    scans.start()
    assert scans.live is None
    assert sentence in scans.sentences[-1]


def test_a_file_that_cannot_be_read_changes_nothing(scans, tmp_path):
    before = scans.draft.path
    scans.open_frames(tmp_path / "missing.xyz")
    assert "missing.xyz" in scans.sentences[-1]
    assert scans.draft.path == before


def test_frames_are_read_anew_when_the_molecule_changes(scans, study, tmp_path):
    follow(scans, tmp_path, frames(1.4, 1.6))
    assert isinstance(scans.spec().path, FramesPath)
    study[0] = studies.study(system=studies.molecule(atoms=(("F", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 0.9))))
    assert "has other atoms" in scans.obstacle
    study[0] = studies.study(system=studies.molecule(unit="bohr", atoms=(("Li", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 3.0))))
    assert not scans.obstacle
    assert scans.frames_told.endswith("read in bohr")
    assert scans.spec().at(2.0).system.unit == "bohr"


def test_frames_need_a_molecule(scans, study, tmp_path):
    from thalweg.systems import LatticeModel

    follow(scans, tmp_path, frames(1.4, 1.6))
    study[0] = study[0].model_copy(update={"system": LatticeModel()})
    assert "Frames need a molecule" in scans.obstacle


def test_a_file_that_is_no_text_is_refused_and_the_frames_chosen_before_stay(scans, tmp_path):
    follow(scans, tmp_path, frames(1.4, 1.6))
    (tmp_path / "picture.xyz").write_bytes(b"\x89PNG\0\x01\xff")
    scans.open_frames(tmp_path / "picture.xyz")
    assert scans.sentences == ["picture.xyz is no text: geometries are written in plain text. Choose an XYZ file with several geometries."]
    assert scans.frames_told.startswith("stretch.xyz: 2 frames")
