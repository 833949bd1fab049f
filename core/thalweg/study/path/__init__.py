"""Paths of a scan: one options class each with `at(spec, value) -> StudySpec`; the list order is the menu order."""

from thalweg.registry import Alternatives
from thalweg.study.path.angle import AnglePath
from thalweg.study.path.base import ScanPath
from thalweg.study.path.bond import BondPath
from thalweg.study.path.breathe import BreathePath
from thalweg.study.path.dihedral import DihedralPath
from thalweg.study.path.frames import FramesPath
from thalweg.study.path.setting import SettingPath
from thalweg.study.path.stretch import StretchPath

PATHS: Alternatives[ScanPath] = Alternatives("path", [BondPath, AnglePath, DihedralPath, StretchPath, BreathePath, FramesPath, SettingPath])

__all__ = ["PATHS", "AnglePath", "BondPath", "BreathePath", "DihedralPath", "FramesPath", "ScanPath", "SettingPath", "StretchPath"]
