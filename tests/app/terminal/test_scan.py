"""`thalweg scan` as a person uses it: answers, files, stopping and going on, and one sentence for whatever does not fit."""

from __future__ import annotations

import csv
import json
import os
import re
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from thalweg.storage.session import load_session

H2 = ["H2", "--from", "0.6", "--to", "1.0", "--points", "5", "--executor", "serial"]
#: What a reader of the JSON may rely on.
PROMISED_POINT = {"coordinate", "unit", "energy", "exact_energy", "reference_energy", "error", "flags"}
PROMISED_CURVE = {"r_e", "e_min", "d_e", "omega_e"}


def scanned(thalweg, *words: str) -> dict:
    status, out, err = thalweg("scan", *words, "--json", "-", "--quiet")
    assert status == 0, err
    return json.loads(out)


# --- the answer ---------------------------------------------------------------------------------------------------------


def test_the_json_has_every_promised_field(thalweg):
    curve = scanned(thalweg, *H2)
    assert [p["coordinate"] for p in curve["points"]] == [0.6, 0.7, 0.8, 0.9, 1.0]
    assert all(p.keys() >= PROMISED_POINT and p["unit"] == "angstrom" and p["flags"] == [] for p in curve["points"])
    for name in ("exact", "variational"):
        assert curve[name].keys() >= PROMISED_CURVE
        assert curve[name]["r_e"] == pytest.approx(0.73487, abs=2e-3)  # model value of full CI in STO-3G, recomputed with PySCF
        assert curve[name]["e_min"] == pytest.approx(-1.13730605, abs=1e-4)
        assert curve[name]["omega_e"] == pytest.approx(5001.8, rel=2e-2)
    assert curve["max_error"] < 1e-8
    assert curve["npe"] < 1e-8
    # Open data: full CI of the HDF5 file H2_sto-3g_singlet_0.7 of the openfermion package.
    assert curve["points"][1]["exact_energy"] == pytest.approx(-1.13618945, abs=1e-7)


def test_the_answer_begins_with_the_verdict_and_names_what_was_typed(thalweg):
    literature = ["--literature", "r_e=0.74144,omega_e=4401.213,d_e=4.7477 eV", "--literature-source", "Huber and Herzberg 1979"]
    status, out, err = thalweg("scan", *H2, *literature, "--errors-in", "kcal/mol", "--lengths-in", "bohr")
    assert status == 0
    lines = out.splitlines()
    assert lines[0].startswith("Reaches the target at all 5 points; largest error ")
    assert re.search(r"r_e / bohr +1\.38\d+ +1\.38\d+ +1\.40112", out)
    assert re.search(r"D_e / Eh +- +- +0\.1744", out)
    assert "Literature as typed: Huber and Herzberg 1979" in out
    assert "kcal/mol" in next(line for line in lines if line.startswith("Largest error"))
    assert "1.13384 bohr to 1.88973 bohr" in out
    assert "Fit of the exact curve: polynomial" in out
    assert "principal isotopes" in out
    assert out.isascii()
    assert "Expected time for 5 points: about" in err
    assert "of 5 points" in err


def test_without_typed_values_there_is_no_literature_column(thalweg):
    assert "Literature" not in thalweg("scan", *H2, "--quiet")[1]


@pytest.mark.parametrize(
    ("words", "axis", "unit", "values"),
    [
        (["H2O", "--bond", "1,2", "--points", "0.9,1.1"], "O1-H2 distance", "angstrom", [0.9, 1.1]),
        (["H2O", "--angle", "2,1,3", "--from", "90", "--to", "110", "--points", "2"], "Angle 2-1-3", "degree", [90.0, 110.0]),
        (["H4_square", "--dihedral", "1,2,3,4", "--points", "0 10"], "Dihedral 1-2-3-4", "degree", [0.0, 10.0]),
        (["H2O", "--stretch", "1-2,1-3", "--points", "0.9,1.1"], "Length of bonds 1-2,1-3", "angstrom", [0.9, 1.1]),
        (["H4_square", "--breathe", "--from", "0.5", "--to", "2", "--points", "3", "--geometric"], "Scale of all distances", "", [0.5, 1.0, 2.0]),
        (["H2", "--vary", "target.error", "--points", "1e-4,1e-3"], "target.error", "", [1e-4, 1e-3]),
    ],
)
def test_every_path_has_its_option(thalweg, words, axis, unit, values):
    curve = scanned(thalweg, *words, "--executor", "serial", "--set", "stop.evaluations=1")
    assert (curve["axis"], curve["unit"]) == (axis, unit)
    assert [p["coordinate"] for p in curve["points"]] == values


def test_frames_of_a_file_are_the_points(thalweg):
    Path("frames.xyz").write_text("".join(f"2\nframe\nH 0 0 0\nH 0 0 {r}\n" for r in (0.7, 0.8, 0.9)))
    curve = scanned(thalweg, "frames.xyz", "--frames", "--executor", "serial")
    assert [p["coordinate"] for p in curve["points"]] == [1.0, 2.0, 3.0]
    by_bond = scanned(thalweg, "H2", "--points", "0.7,0.8,0.9", "--executor", "serial")
    assert [p["energy"] for p in curve["points"]] == pytest.approx([p["energy"] for p in by_bond["points"]], abs=1e-9)
    assert curve["exact"]["r_e"] is None
    Path("mixed.xyz").write_text("2\n\nH 0 0 0\nH 0 0 1\n2\n\nH 0 0 0\nLi 0 0 1\n")
    assert "Frame 2 of mixed.xyz has other atoms" in thalweg("scan", "mixed.xyz", "--frames")[2]


def test_every_option_reaches_the_settings(thalweg):
    words = ["--no-follow", "--both-directions", "--spin", "fixed", "--reduced-mass", "1.5", "--encoding", "parity", "--classical", "mp2"]
    curve = scanned(thalweg, "H2", "--points", "0.7,0.8", "--executor", "serial", *words)
    spec = curve["spec"]
    assert (spec["follow_orbitals"], spec["both_directions"], spec["spin"], spec["reduced_mass"]) == (False, True, "fixed", 1.5)
    assert (spec["study"]["encoding"]["key"], spec["study"]["classical"]) == ("parity", ["mp2"])
    assert all(p["classical"]["mp2"] < p["reference_energy"] for p in curve["points"])


def test_a_field_is_varied_and_the_energy_per_site_is_stated(thalweg):
    # Transverse-field Ising ring, Pfeuty 1970: E = -sum_k sqrt(1 + h^2 - 2 h cos k), k = (2m + 1) pi / N; N = 8.
    system = ["--vary", "system.model.field", "--points", "0.5,1,2", "--executor", "serial", "--set", "stop.evaluations=1"]
    Path("ising.json").write_text(ising_session())
    curve = scanned(thalweg, "ising.json", *system)
    energies = {p["coordinate"]: p["exact_energy"] for p in curve["points"]}
    assert energies == pytest.approx({0.5: -8.5090822351, 1.0: -10.2516617910, 2.0: -17.0181644703}, abs=1e-8)
    assert curve["points"][0]["energy_per_site"] == pytest.approx(curve["points"][0]["energy"] / 8)


def ising_session() -> str:
    from thalweg.ansatz import HardwareEfficient
    from thalweg.storage.session import Session
    from thalweg.study.spec import StudySpec
    from thalweg.systems import LatticeModel
    from thalweg.systems.lattice import Chain
    from thalweg.systems.spin_models import Ising

    system = LatticeModel(lattice=Chain(sites=8), model=Ising())
    return Session(setup=StudySpec(system=system, ansatz=HardwareEfficient(depth=1))).model_dump_json()


# --- files --------------------------------------------------------------------------------------------------------------


def test_the_csv_states_units_and_settings_and_holds_every_point(thalweg):
    assert thalweg("scan", *H2, "--csv", "curve.csv", "--errors-in", "kJ/mol", "--classical", "mp2", "--quiet")[0] == 0
    lines = Path("curve.csv").read_text().splitlines()
    notes, body = [line for line in lines if line.startswith("# ")], [line for line in lines if not line.startswith("# ")]
    assert any("energies in Eh, errors against exact in kJ/mol; coordinate in angstrom" in line for line in notes)
    settings = next(line for line in notes if line.startswith("# settings: "))
    assert json.loads(settings.removeprefix("# settings: "))["study"]["system"]["basis"] == "sto-3g"
    rows = list(csv.DictReader(body))
    assert [float(row["H1-H2 distance / angstrom"]) for row in rows] == [0.6, 0.7, 0.8, 0.9, 1.0]
    assert float(rows[1]["exact / Eh"]) == pytest.approx(-1.13618945, abs=1e-7)
    assert "error / kJ/mol" in rows[0]
    assert float(rows[0]["MP2 / Eh"]) < float(rows[0]["reference / Eh"])


@pytest.mark.parametrize(("name", "begins"), [("c.png", b"\x89PNG"), ("c.svg", b"<?xml"), ("c.pdf", b"%PDF")])
def test_the_curve_is_drawn(thalweg, name, begins):
    assert thalweg("scan", "H2", "--points", "0.7,0.8", "--executor", "serial", "--figure", name, "--quiet")[0] == 0
    content = Path(name).read_bytes()
    assert content.startswith(begins)
    if name.endswith("svg"):
        for word in ("UCCSD", "Exact", "Hartree-Fock", "H1-H2 distance / Å"):
            assert word in content.decode("utf-8")


def test_a_scan_is_saved_refined_resumed_and_checked(thalweg):
    assert thalweg("scan", *H2, "--save", "s.json", "--quiet")[0] == 0
    assert thalweg("scan", "H2", "--points", "0.7,0.8", "--executor", "serial", "--save", "s.json", "--quiet")[0] == 0
    assert [scan.number for scan in load_session(Path("s.json")).scans] == [1, 2]
    before = load_session(Path("s.json")).scans[1].result
    assert thalweg("scan", "--resume", "s.json", "--refine", "3", "--points", "0.9,1.2", "--executor", "serial", "--quiet")[0] == 0
    session = load_session(Path("s.json"))
    assert [scan.number for scan in session.scans] == [1, 2]
    points = session.scans[1].result.points
    assert {0.7, 0.8, 0.9, 1.2} < {p.coordinate for p in points}
    assert len(points) == 7
    assert [p.result for p in points if p.coordinate in (0.7, 0.8)] == [p.result for p in before.points]  # not run again
    status, out, _ = thalweg("check", "s.json", "--quiet")
    assert status == 0, out
    assert out.count(": repeats\n") == 2
    assert "Every run and scan repeats within 1e-07." in out


def test_a_changed_scan_does_not_repeat(thalweg):
    thalweg("scan", "H2", "--points", "0.7,0.8", "--executor", "serial", "--save", "s.json", "--quiet")
    data = json.loads(Path("s.json").read_text())
    data["scans"][0]["result"]["points"][1]["result"]["energy"] += 1e-4
    Path("s.json").write_text(json.dumps(data))
    status, out, _ = thalweg("check", "s.json", "--quiet")
    assert status == 1
    assert "PAST TOLERANCE" in out
    assert "1.00e-4 Eh at 0.8 angstrom" in out


def test_ctrl_c_keeps_finished_points_and_the_scan_goes_on_from_its_session(tmp_path, thalweg):
    words = ["scan", "H2", "--from", "0.5", "--to", "2.5", "--points", "400", "--executor", "serial", "--save", "s.json"]
    process = subprocess.Popen(
        [sys.executable, "-m", "thalweg_app", *words], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=own_environment()
    )
    seen = ""
    until = time.monotonic() + 120
    while "of 400 points" not in seen and time.monotonic() < until:
        seen += process.stderr.readline()
    process.send_signal(signal.SIGINT)
    out, err = process.communicate(timeout=60)
    assert process.returncode == 130, seen + err
    assert out.startswith("Unfinished: ")
    stopped = load_session(Path("s.json")).scans[0].result
    assert not stopped.finished
    count = len(stopped.points)
    assert 1 <= count < 400
    data = json.loads(Path("s.json").read_text())
    result = data["scans"][0]["result"]
    result["points"] = result["points"][:2]
    result["spec"]["points"] = [*(p["coordinate"] for p in result["points"]), 2.6]  # so that little is left to do
    Path("s.json").write_text(json.dumps(data))
    assert thalweg("scan", "--resume", "s.json", "--executor", "serial", "--quiet")[0] == 0
    resumed = load_session(Path("s.json")).scans[0].result
    assert resumed.finished
    assert [p.coordinate for p in resumed.points] == result["spec"]["points"]
    assert [p.result for p in resumed.points[:-1]] == [p.result for p in stopped.points[:2]]


def own_environment() -> dict[str, str]:
    root = Path(__file__).parents[3]
    return os.environ | {"PYTHONPATH": os.pathsep.join([str(root / "core"), str(root / "app")]), "PYTHONUNBUFFERED": "1"}


# --- bad input ------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        ([], "neither INPUT nor --resume"),
        (["H2O", "--from", "1", "--to", "2", "--points", "3"], "a scan needs a path"),
        (["H2", "--from", "1", "--points", "3"], "--to is missing"),
        (["H2", "--points", "4"], "needs a range"),
        (["H2", "--from", "1", "--to", "2"], "--points is missing"),
        (["H2", "--from", "1", "--to", "2", "--points", "1"], "at least 2 points"),
        (["H2", "--from", "-1", "--to", "2", "--points", "3", "--geometric"], "cannot cross zero"),
        (["H2", "--points", "a,b"], "Cannot read the points"),
        (["H2", "--bond", "1,5", "--points", "0.7,0.8"], "no atom 5"),
        (["H2", "--bond", "1", "--points", "0.7,0.8"], "numbers of 2 atoms"),
        (["H2", "--bond", "1,2", "--breathe", "--points", "0.7,0.8"], "exclude each other"),
        (["H2", "--vary", "ansatz.order", "--points", "0.7,0.8"], "cannot be varied"),
        (["H2", "--vary", "nothing", "--points", "0.7,0.8"], "cannot be varied"),
        (["N2_6e6o", "--bond", "1,2", "--points", "0.7,0.8"], "needs a geometry"),
        (["H2", "--frames", "--from", "1", "--to", "2", "--points", "2"], "has no range"),
        (["N2_6e6o", "--frames"], "has no atoms"),
        (["-", "--frames"], "Standard input is empty"),
        (["H2", "--literature", "r=1", "--points", "0.7,0.8"], "Cannot read --literature r=1"),
        (["H2", "--literature", "r_e=1 bohr", "--points", "0.7,0.8"], "Cannot read --literature r_e=1 bohr"),
        (["H2", "--points", "0.7,0.8", "--executor", "dask"], "No Dask scheduler is named"),
        (["H2", "--points", "0.7,0.8", "--json", "-", "--csv", "-"], "exclude each other"),
        (["H2", "--points", "0.7,0.8", "--figure", "c.gif"], "png, svg or pdf"),
        (["H2", "--points", "0.7,0.8", "--csv", "none/c.csv"], "there is no folder"),
        (["H2", "--points", "0.7,0.8", "--save", "taken"], "is not overwritten"),
        (["--resume", "taken"], "taken"),
        (["--resume", "empty.json"], "no scan to resume"),
        (["H2", "--resume", "empty.json"], "--resume and INPUT exclude each other"),
        (["--resume", "empty.json", "--basis", "6-31g"], "--resume and --basis exclude each other"),
    ],
)
def test_bad_input_is_one_line_with_status_2(thalweg, monkeypatch, words, sentence):
    from thalweg.storage.session import Session, save_session

    Path("taken").write_text("something else")
    save_session(Session(), Path("empty.json"))
    monkeypatch.setattr("sys.stdin", open(os.devnull))  # noqa: SIM115
    status, out, err = thalweg("scan", *words, "--quiet")
    assert status == 2
    assert out == ""
    assert sentence in err
    assert len(err.splitlines()) == 1
    assert {path.name for path in Path().iterdir()} == {"taken", "empty.json"}


def test_a_point_that_cannot_be_is_told_and_the_rest_is_there(thalweg):
    status, out, err = thalweg("scan", "H2", "--points", "0.001,0.7,0.8", "--executor", "serial")
    assert status == 0
    assert out.splitlines()[0].endswith("; 1 point failed.")
    assert "At 0.001 angstrom: failed. " in out
    assert "At 0.001 angstrom: failed. " in err


def test_a_defect_at_a_point_is_logged_and_the_rest_is_there(thalweg, tmp_path, monkeypatch):
    from thalweg.study import scan_task

    def broken(spec, *args, **kwargs):
        if spec.system.atoms[1][3] == 0.8:
            raise ZeroDivisionError("made for this test")
        return whole(spec, *args, **kwargs)

    whole = scan_task.run_from
    monkeypatch.setattr(scan_task, "run_from", broken)
    status, out, err = thalweg("scan", "H2", "--points", "0.7,0.8,0.9", "--executor", "serial", "--quiet")
    assert status == 0
    assert "At 0.8 angstrom: failed. A defect of the program: ZeroDivisionError: made for this test" in out
    assert "made for this test" in (tmp_path / "state" / "thalweg" / "thalweg.log").read_text()
    assert "thalweg.log" in err
