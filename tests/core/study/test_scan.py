"""Scans: the same curve from every executor, kept points on stop, resumed scans, lost workers, and curves known from outside."""

import os
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from pathlib import Path

import numpy as np
import pytest

from thalweg.errors import StudyError
from thalweg.study import scan_tasks
from thalweg.study.executors import InProcess, local_pool, make_executor
from thalweg.study.path import BondPath, BreathePath, SettingPath, StretchPath
from thalweg.study.scan import run_scan
from thalweg.study.scan_spec import ScanSpec, linear_points
from thalweg.study.spec import Molecule, StudySpec, with_setting
from thalweg.systems.molecular_data import read_molecular_data

H2 = StudySpec(system=Molecule(name="H2", atoms=(("H", 0, 0, 0), ("H", 0, 0, 0.7414))))
LIH = StudySpec(system=Molecule(name="LiH", atoms=(("Li", 0, 0, 0), ("H", 0, 0, 1.5957))))
DATA = Path(__import__("openfermion").__file__).parent / "testing" / "data"


def serial(scan, **kwargs):
    return run_scan(scan, InProcess, **kwargs)


def energies(result):
    return [p.result.energy for p in result.points]


@pytest.fixture(scope="module")
def h2_curve():
    return serial(ScanSpec(study=H2, points=linear_points(0.5, 3.0, 26)))


def test_h2_equals_the_stored_full_ci_at_every_bundled_distance():
    # Open data: HDF5 molecular data files of the openfermion package, H2 STO-3G at 31 distances.
    files = {float(f.stem.split("_")[-1]): f for f in DATA.glob("H2_sto-3g_singlet_*.hdf5")}
    result = serial(ScanSpec(study=H2, points=tuple(files)))
    assert len(result.points) == len(files) == 31
    for point in result.points:
        stored = dict(read_molecular_data(files[point.coordinate]).stored_energies)["FCI"]
        assert point.result.exact_energy == pytest.approx(stored, abs=5e-8)
        assert point.result.energy == pytest.approx(stored, abs=5e-8)
    assert result.max_error < 1e-8
    assert result.npe < 1e-8


@pytest.mark.parametrize(
    ("basis", "r_e", "e_min", "omega_e"),
    # Full-CI curves recomputed with PySCF, principal isotopes.
    [("sto-3g", 0.73487, -1.13730605, 5001.8), ("6-31g", 0.74620, -1.15169785, 4367.1), ("cc-pvtz", 0.74262, -1.17233669, 4409.4)],
)
def test_constants_of_the_hydrogen_molecule(basis, r_e, e_min, omega_e):
    study = with_setting(with_setting(H2, "system.basis", basis), "stop.evaluations", 1)  # only the exact curve is of interest
    result = serial(ScanSpec(study=study, points=linear_points(0.55, 0.95, 9)))
    assert result.exact.r_e == pytest.approx(r_e, rel=5e-4)
    assert result.exact.e_min == pytest.approx(e_min, abs=2e-6)
    assert result.exact.omega_e == pytest.approx(omega_e, rel=5e-3)
    assert "ln r" in result.exact.fit
    assert any("principal isotopes" in remark for remark in result.remarks)


def test_the_depth_of_the_well_is_that_of_separated_atoms(h2_curve):
    # Two hydrogen atoms in STO-3G: 2 * -0.46658185 Eh (memory, Szabo and Ostlund), so D_e = .204142 Eh.
    far = serial(ScanSpec(study=H2, points=(*linear_points(0.5, 1.25, 16), 4.0, 6.0)))
    assert far.exact.d_e == pytest.approx(0.204142, abs=2e-4)
    assert far.variational.d_e == pytest.approx(0.204142, abs=2e-4)
    near = serial(ScanSpec(study=H2, points=linear_points(0.5, 1.25, 8)))
    assert near.exact.d_e is None
    assert any("does not reach separated fragments" in remark for remark in near.exact.remarks)


def test_a_local_pool_gives_the_same_curve_to_the_last_digit():
    scan = ScanSpec(study=LIH, points=linear_points(1.2, 3.4, 10))
    one = serial(scan)
    other = run_scan(scan, lambda: local_pool(2))
    assert energies(other) == energies(one)
    assert other.model_dump(exclude={"seconds", "points"}) == one.model_dump(exclude={"seconds", "points"})


def test_a_dask_cluster_of_two_processes_gives_the_same_curve():
    distributed = pytest.importorskip("distributed")
    scan = ScanSpec(study=H2, points=linear_points(0.6, 2.0, 9))
    with distributed.LocalCluster(n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None) as cluster:
        result = run_scan(scan, lambda: make_executor("dask", scheduler=cluster.scheduler_address))
    assert energies(result) == energies(serial(scan))


def test_stopping_keeps_finished_points_and_a_resumed_scan_completes_them():
    scan = ScanSpec(study=H2, points=linear_points(0.6, 2.0, 12))
    seen = []
    stopped = serial(scan, emit=seen.append, should_stop=lambda: sum(e.kind == "scan-point" for e in seen) >= 4)
    assert not stopped.finished
    assert stopped.verdict.startswith("Unfinished: ")
    assert 4 <= len(stopped.points) < 12
    again = []
    resumed = serial(scan, emit=again.append, done=stopped.points)
    assert resumed.finished
    new = {e.point.coordinate for e in again if e.kind == "scan-point"}
    assert not new & {p.coordinate for p in stopped.points}
    assert energies(resumed) == pytest.approx(energies(serial(scan)), abs=1e-7)


def end_process_once(folder, *_):
    marker = Path(folder) / "ended"
    if not marker.exists():
        marker.touch()
        os._exit(9)


def test_a_killed_worker_costs_one_retried_point(tmp_path):
    scan = ScanSpec(study=H2, points=linear_points(0.6, 1.0, 4))
    killed = []

    class Pool(ProcessPoolExecutor):
        def submit(self, fn, /, *args, **kwargs):
            if not killed and args[1] == scan.points[2]:
                killed.append(args[1])
                return super().submit(end_process_once, str(tmp_path))
            return super().submit(fn, *args, **kwargs)

    result = run_scan(scan, lambda: Pool(1, mp_context=local_context()))
    assert killed
    assert result.finished
    assert energies(result) == energies(serial(scan))


def local_context():
    import multiprocessing

    return multiprocessing.get_context("spawn")


def test_a_worker_lost_twice_fails_its_point_with_a_sentence():
    tasks = scan_tasks.PointTasks(InProcess, lambda: False)

    class Broken(InProcess):
        def submit(self, fn, /, *args, **kwargs):
            return super().submit(raise_broken)

    tasks = scan_tasks.PointTasks(Broken, lambda: False)
    tasks.submit((0, []), ScanSpec(study=H2, points=(1.0,)), 1.0, None)
    ((_, outcome),) = list(tasks.results())
    assert "ended twice" in outcome.failure


def raise_broken():
    raise BrokenProcessPool


def test_points_that_cannot_be_are_failures_with_their_sentence_and_the_rest_goes_on():
    scan = ScanSpec(study=H2, path=BondPath(), points=(0.001, 0.7, 0.8))
    result = serial(scan)
    assert result.points[0].flags == ("failed",)
    assert "one spot" in result.points[0].failure
    assert result.finished
    assert result.verdict.endswith("; 1 point failed")
    assert any("1 point failed: 0.001" in remark for remark in result.remarks)


def test_a_path_that_does_not_fit_is_refused_before_anything_runs():
    with pytest.raises(StudyError):
        serial(ScanSpec(study=H2, path=BondPath(second=7), points=(1.0, 2.0)))


def test_a_breathing_scan_has_a_minimum_and_no_frequency():
    square = StudySpec(system=Molecule(atoms=(("H", 0, 0, 0), ("H", 0, 0, 0.9), ("H", 0, 1.2, 0), ("H", 0, 1.2, 0.9))))
    result = serial(ScanSpec(study=square, path=BreathePath(), points=linear_points(0.7, 1.3, 9)))
    assert result.exact.omega_e is None
    assert result.variational.r_e == pytest.approx(result.exact.r_e, abs=5e-3)


def test_a_setting_is_varied():
    result = serial(ScanSpec(study=H2, path=SettingPath(setting="target.error"), points=(1e-4, 1e-3)))
    assert [p.result.target_error for p in result.points] == [1e-4, 1e-3]


def test_an_active_space_that_swaps_is_followed_or_flagged():
    # BeH2 in a space of four orbitals: along the symmetric stretch virtual orbitals cross and the energies would choose others.
    beh2 = StudySpec(system=Molecule(atoms=(("Be", 0, 0, 0), ("H", 0, 0, 1.3), ("H", 0, 0, -1.3)), active_space="4e,4o"))
    scan = ScanSpec(study=beh2, path=StretchPath(bonds="1-2,1-3"), points=linear_points(1.2, 3.4, 12))
    followed = serial(scan)
    plain = serial(scan.model_copy(update={"follow_orbitals": False}))
    changed = [p.coordinate for p in plain.points if "active-space-changed" in p.flags]
    assert changed
    assert not [p for p in followed.points if "active-space-changed" in p.flags]
    beyond = slice(3, None)  # past the minimum, where the swaps are
    assert np.abs(np.diff(energies(followed), 2))[beyond].max() < 0.6 * np.abs(np.diff(energies(plain), 2))[beyond].max()
