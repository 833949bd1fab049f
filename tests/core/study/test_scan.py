"""Scans: the same curve from every executor, kept points on stop, resumed scans, lost workers, and curves known from outside."""

import itertools
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from support.scans import H2, LIH, energies, serial

from thalweg.ansatz import HardwareEfficient
from thalweg.errors import StudyError
from thalweg.study import executors
from thalweg.study.executors import local_pool, make_executor
from thalweg.study.path import AnglePath, BondPath, BreathePath, SettingPath, StretchPath
from thalweg.study.scan import run_scan
from thalweg.study.scan_foresight import foresee
from thalweg.study.scan_refine import refined
from thalweg.study.scan_spec import ScanSpec, linear_points
from thalweg.study.spec import Molecule, StudySpec, with_setting
from thalweg.systems import LatticeModel
from thalweg.systems.lattice import Chain
from thalweg.systems.molecular_data import read_molecular_data
from thalweg.systems.spin_models import Heisenberg, Ising

DATA = Path(__import__("openfermion").__file__).parent / "testing" / "data"


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
    study = with_setting(with_setting(H2, "system.basis", basis), "ansatz", "number-conserving")
    study = with_setting(study, "stop.gradient", 1e3)  # only the exact curve is of interest: every start is as good as converged
    result = serial(ScanSpec(study=study, points=linear_points(0.65, 0.85, 7)))
    assert result.exact.r_e == pytest.approx(r_e, rel=5e-4)
    assert result.exact.e_min == pytest.approx(e_min, abs=2e-6)
    assert result.exact.omega_e == pytest.approx(omega_e, rel=5e-3)
    assert "ln r" in result.exact.fit
    assert any("principal isotopes" in remark for remark in result.remarks)


def test_the_depth_of_the_well_is_that_of_separated_atoms():
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
    from distributed import LocalCluster

    scan = ScanSpec(study=H2, points=linear_points(0.6, 2.0, 9))
    with LocalCluster(n_workers=2, threads_per_worker=1, processes=True, dashboard_address=":0") as cluster:
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


def test_the_transition_of_an_ising_ring_shows_along_its_field():
    # Transverse-field Ising ring, Pfeuty 1970: E = -sum_k sqrt(1 + h^2 - 2 h cos k), k = (2m + 1) pi / N.
    n = 10
    study = StudySpec(system=LatticeModel(lattice=Chain(sites=n), model=Ising()), ansatz=HardwareEfficient(depth=1))
    study = with_setting(study, "stop.evaluations", 1)
    result = serial(ScanSpec(study=study, path=SettingPath(setting="system.model.field"), points=linear_points(0.2, 2.0, 19)))
    k = (2 * np.arange(n) + 1) * np.pi / n
    for point in result.points:
        closed = -np.sqrt(1 + point.coordinate**2 - 2 * point.coordinate * np.cos(k)).sum()
        assert point.result.exact_energy == pytest.approx(closed, abs=1e-9)
        assert point.energy_per_site == point.result.energy / n
    assert result.transition == pytest.approx(1.0, abs=0.15)  # of a ring this small; 1 for an infinite one
    assert result.level_crossings == ()
    assert result.exact.r_e is None


def test_the_number_of_sites_is_varied_without_derivatives():
    study = with_setting(
        StudySpec(system=LatticeModel(lattice=Chain(), model=Heisenberg()), ansatz=HardwareEfficient(depth=1)), "stop.evaluations", 1
    )
    result = serial(ScanSpec(study=study, path=SettingPath(setting="system.lattice.sites"), points=(4, 6, 8)))
    # Heisenberg rings, energies per site: exact diagonalisation, recomputed.
    assert [p.result.exact_energy / p.coordinate for p in result.points] == pytest.approx([-0.5, -0.467129273, -0.456386676], abs=1e-8)
    assert result.transition is None


def test_the_spin_of_the_exact_state_is_flagged_where_it_changes_or_is_kept_fixed():
    # Methylene in STO-3G: a triplet when it is open, a singlet when it is bent far enough.
    study = StudySpec(system=Molecule(atoms=(("C", 0, 0, 0), ("H", 0, 0.98, 0.3), ("H", 0, -0.98, 0.3)), active_space="frozen-core"))
    scan = ScanSpec(study=study, path=AnglePath(first=2, vertex=1, last=3), points=(70, 80, 95, 110))
    free, fixed = serial(scan), serial(scan.model_copy(update={"spin": "fixed"}))
    assert [round(p.result.exact_s_squared, 6) for p in free.points] == [0.0, 2.0, 2.0, 2.0]
    assert [p.flags for p in free.points] == [(), ("spin-changed",), (), ()]
    assert "The exact state changes from S^2 = 0.00 at 70 to 2.00 at 80." in free.remarks
    assert free.verdict.startswith("In a state of other symmetry or spin than the exact one at 3 of 4 points (80 to 110)")
    assert [round(p.result.exact_s_squared, 6) for p in fixed.points] == [0.0] * 4
    assert fixed.verdict.startswith("Reaches the target at all 4 points")
    gaps = [b.result.exact_energy - a.result.exact_energy for a, b in zip(free.points, fixed.points, strict=True)]
    assert gaps[0] == pytest.approx(0.0, abs=1e-9)
    assert all(gap > 5e-3 for gap in gaps[1:])
    assert "lies 10.1 mEh lower" in fixed.points[1].result.remarks[0]


def test_points_are_added_where_they_are_wanted_and_the_others_are_not_run_again():
    scan = ScanSpec(study=LIH, points=linear_points(1.0, 4.0, 7))
    first = serial(scan)
    for where, low, high in (("minimum", 1.0, 2.0), ("error", 2.5, 4.0)):
        wider = refined(first, 4, where)
        added = set(wider.points) - set(scan.points)
        assert len(added) == 4
        assert all(low <= x <= high for x in added)
    wider, seen = refined(first, 4, "minimum"), []
    again = serial(wider, emit=seen.append, done=first.points, checked=first.finished)
    assert {e.point.coordinate for e in seen if e.kind == "scan-point"} == set(wider.points) - set(scan.points)
    assert [p.result for p in again.points if p.coordinate in scan.points] == [p.result for p in first.points]
    assert again.exact.r_e == pytest.approx(1.54752, abs=2e-4)
    assert energies(again) == pytest.approx(energies(serial(wider)), abs=1e-7)
    with pytest.raises(StudyError, match="more points"):
        refined(first, 0, "error")
    whole = serial(ScanSpec(study=H2, path=SettingPath(setting="starts"), points=(1, 2)))
    with pytest.raises(StudyError, match="No room"):
        refined(whole, 1, "minimum")


def test_a_curve_built_to_jump_is_flagged_retried_and_mended(monkeypatch):
    # The parameters that one point would take over are spoilt on the way, and its search may not last: it stays far above its neighbours.
    from thalweg.study import scan_task

    def short_at_one_point(spec, seed, **kwargs):
        first = spec.system.atoms[1][3] == 2.0 and not calls
        if first:
            calls.append(spec)
            spec = with_setting(spec, "stop.gradient", 1.0)
            seed = replace(seed, parameters=tuple(0.3 for _ in seed.parameters))
        return whole(spec, seed, **kwargs)

    calls, seen, whole = [], [], scan_task.run_from
    monkeypatch.setattr(scan_task, "run_from", short_at_one_point)
    result = serial(ScanSpec(study=LIH, points=linear_points(1.2, 2.8, 9)), emit=seen.append)
    told = [e.point for e in seen if e.kind == "scan-point" and e.point.coordinate == 2.0]
    assert told[0].result.error > 1e-2
    mended = next(p for p in result.points if p.coordinate == 2.0)
    assert mended.flags == ("retried",)
    assert mended.result.error < 1e-4


def test_a_point_that_no_start_mends_stays_marked(monkeypatch):
    from thalweg.study import scan_task

    def spoilt(spec, *args, **kwargs):
        result, seed = whole(spec, *args, **kwargs)
        if spec.system.atoms[1][3] != 1.0:
            return result, seed
        return result.model_copy(update={"energy": result.energy + 5e-3, "error": result.error + 5e-3}), seed

    whole = scan_task.run_from
    monkeypatch.setattr(scan_task, "run_from", spoilt)
    seen = []
    result = serial(ScanSpec(study=H2, points=linear_points(0.6, 1.4, 9)), emit=seen.append)
    assert [p.coordinate for p in result.points if "jump" in p.flags] == [1.0]
    assert result.points[4].flags == ("jump", "retried")
    assert any(e.kind == "stage" and e.text.startswith("Trying 4 starts") for e in seen)


def test_both_directions_keep_the_lower_energy_of_each_point():
    scan = ScanSpec(study=H2, points=linear_points(0.6, 1.4, 4))
    both = serial(scan.model_copy(update={"both_directions": True}))
    assert energies(both) == pytest.approx(energies(serial(scan)), abs=1e-8)
    assert both.finished


def test_the_time_foretold_grows_with_the_points_and_shrinks_with_the_workers(monkeypatch):
    clock = itertools.count()  # every reading of it is a second later
    monkeypatch.setattr("thalweg.study.scan_foresight.time.perf_counter", lambda: float(next(clock)))
    scan = ScanSpec(study=H2, points=linear_points(0.6, 1.4, 16))
    longer = scan.model_copy(update={"points": linear_points(0.6, 1.4, 160)})
    alone = foresee(scan, 1)
    assert alone > 16 * (1 + 30)  # a second to prepare each point, and thirty evaluations of a second
    assert foresee(longer, 1) == pytest.approx(10 * alone)
    assert foresee(longer, 4) == pytest.approx(executors.START_UP + 10 * alone / 4)
    assert foresee(scan, 16) == pytest.approx(executors.START_UP + alone / 2)  # two blocks of neighbours
    assert foresee(scan.model_copy(update={"both_directions": True}), 1) > 1.8 * alone


def test_a_scan_without_points_is_refused():
    with pytest.raises(StudyError, match="No points to scan"):
        serial(ScanSpec(study=H2))


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
