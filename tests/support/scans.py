"""What tests of scans share: two diatomics and a scan in the test's own process."""

from thalweg.study.executors import InProcess
from thalweg.study.scan import run_scan
from thalweg.study.spec import Molecule, StudySpec

H2 = StudySpec(system=Molecule(name="H2", atoms=(("H", 0, 0, 0), ("H", 0, 0, 0.7414))))
LIH = StudySpec(system=Molecule(name="LiH", atoms=(("Li", 0, 0, 0), ("H", 0, 0, 1.5957))))


def serial(scan, **kwargs):
    return run_scan(scan, InProcess, **kwargs)


def energies(result):
    return [p.result.energy for p in result.points]
