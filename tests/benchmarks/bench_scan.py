"""Bar B12: a dissociation curve with everything that a study computes, against the same curve scripted with PySCF's defaults and full CI alone."""

from __future__ import annotations

import time

import numpy as np

from thalweg.study.executors import InProcess
from thalweg.study.scan import run_scan
from thalweg.study.scan_spec import ScanSpec, linear_points
from thalweg.study.spec import Molecule, StudySpec

Row = dict[str, object]
FIRST, LAST, POINTS = 0.8, 4.0, 40
REPEATS = 4


def b12_scan() -> list[Row]:
    """LiH, STO-3G, 40 points: integrals, mean field with stability, UCCSD, exact, gates and figures, in one process; equal energies demanded."""
    study = StudySpec(system=Molecule(name="LiH", atoms=(("Li", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 1.5957))))
    scan = ScanSpec(study=study, points=linear_points(FIRST, LAST, POINTS))
    run_scan(scan.model_copy(update={"points": scan.points[:2]}), InProcess)  # kernels are loaded
    scripted_curve(scan.points[:2])
    ours, theirs = [], []
    for _ in range(REPEATS):
        begun = time.perf_counter()
        energies = scripted_curve(scan.points)
        theirs.append(time.perf_counter() - begun)
        begun = time.perf_counter()
        result = run_scan(scan, InProcess)
        ours.append(time.perf_counter() - begun)
    exact = [p.result.exact_energy for p in result.points if p.result is not None]
    assert np.allclose(exact, energies, atol=1e-7, rtol=0)
    assert result.max_error is not None
    assert result.max_error < 2e-4
    text = f"LiH curve of {POINTS} points: Thalweg {min(ours):.2f} s / mean field and full CI alone {min(theirs):.2f} s, at most"
    measured = min(ours) / min(theirs)
    return [{"bar": "B12", "text": text, "measured": measured, "limit": 0.5, "met": measured <= 0.5}]


def scripted_curve(distances: tuple[float, ...]) -> list[float]:
    """What a person writes in a dozen lines."""
    from pyscf import fci, gto, scf

    energies = []
    for r in distances:
        mole = gto.M(atom=f"Li 0 0 0; H 0 0 {r}", basis="sto-3g", verbose=0)
        field = scf.RHF(mole).run()
        energies.append(float(fci.FCI(field).kernel()[0]))
    return energies


BARS = [b12_scan]
