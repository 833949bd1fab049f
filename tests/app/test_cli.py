"""The command line as a person uses it: answers, files, exit statuses, sentences."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from thalweg.paths import data_folder
from thalweg.storage.session import load_session
from thalweg.study.result import StudyResult

SAMPLES = data_folder("sample_systems")

#: What a reader of the JSON may rely on.
PROMISED = {
    "energy",
    "exact_energy",
    "reference_energy",
    "error",
    "verdict",
    "reached_target",
    "qubits",
    "qubits_before_tapering",
    "terms",
    "one_norm",
    "parameters",
    "evaluations",
    "iterations",
    "seconds",
    "stop_reason",
    "gradient_norm",
    "n_electrons",
    "s_z",
    "s_squared",
    "variance",
    "fidelity",
    "seed",
    "versions",
    "spec",
}


def solved(thalweg, *words: str, **more) -> dict:
    status, out, err = thalweg("solve", *words, "--json", "-", **more)
    assert status == 0, err
    return json.loads(out)


# --- the answer ---------------------------------------------------------------------------------------------------------


def test_lithium_hydride_reaches_its_exact_energy(thalweg):
    answer = solved(thalweg, str(SAMPLES / "LiH.xyz"))
    assert answer["exact_energy"] == pytest.approx(-7.88239151, abs=2e-6)  # full CI, STO-3G, recomputed with PySCF; the file has four decimals
    assert 0 <= answer["error"] < 1.1e-5
    assert answer["reached_target"] is True
    assert answer["verdict"].startswith("Reaches chemical accuracy")


def test_the_json_is_one_object_with_every_promised_field_and_reads_back_as_a_result(thalweg):
    answer = solved(thalweg, "h2")
    assert answer.keys() >= PROMISED
    assert answer["spec"]["encoding"]["key"] == "jordan-wigner"
    assert StudyResult.model_validate(answer).energy == answer["energy"]


def test_the_answer_starts_with_the_verdict_and_names_units_error_order_and_seed(thalweg):
    status, out, _ = thalweg("solve", "H2", "--quiet", "--seed", "5", "--classical", "mp2,ccsd")
    assert status == 0
    assert out.startswith("Reaches chemical accuracy: ")
    lines = dict(line.split("  ", 1) for line in out.splitlines()[2:] if "  " in line)
    assert "Eh" in lines["Energy"]
    assert "mEh = " in lines["Error"]
    assert "kcal/mol" in lines["Error"]
    assert lines["Seed"].strip() == "5"
    assert lines["Operator order"].strip()
    assert "Eh" in lines["MP2"]
    assert "CCSD" in lines
    assert out.isascii() or "D∞h" in out


def test_every_option_reaches_the_settings(thalweg):
    words = "--charge 1 --multiplicity 2 --basis 6-31g --unit bohr --active 1e,2o --encoding parity --no-taper --ansatz hardware-efficient --depth 1"
    more = "--optimizer adam --starts 2 --seed 9 --classical mp2 --set optimizer.max_iterations=3 --set stop.gradient=1e-9 --set exact=false"
    spec = solved(thalweg, "H2", *words.split(), *more.split())["spec"]
    system, encoding, ansatz = spec["system"], spec["encoding"], spec["ansatz"]
    assert (system["charge"], system["multiplicity"], system["basis"], system["unit"]) == (1, 2, "6-31g", "bohr")
    assert system["active_space"] == "1e,2o"
    assert (encoding["key"], encoding["taper"]) == ("parity", False)
    assert (ansatz["key"], ansatz["depth"]) == ("hardware-efficient", 1)
    assert (spec["optimizer"]["key"], spec["optimizer"]["max_iterations"]) == ("adam", 3)
    assert (spec["starts"], spec["seed"], spec["classical"], spec["exact"]) == (2, 9, ["mp2"], False)
    assert spec["stop"]["gradient"] == 1e-9


def test_frozen_core_leaves_the_core_out(thalweg):
    answer = solved(thalweg, "LiH", "--frozen-core")
    assert answer["n_electrons"] == pytest.approx(2)
    assert answer["exact_energy"] == pytest.approx(-7.88216403, abs=2e-6)  # full CI with frozen core, recomputed with PySCF


@pytest.mark.parametrize("encoding", ["jordan-wigner", "parity", "bravyi-kitaev"])
def test_the_encoding_does_not_change_the_energy(thalweg, encoding):
    assert solved(thalweg, "H2", "--encoding", encoding)["energy"] == pytest.approx(-1.13727017, abs=1e-6)


def test_a_verdict_that_says_no_is_still_a_study_that_ran(thalweg):
    status, out, _ = thalweg("solve", "LiH", "--optimizer", "gradient-descent", "--set", "optimizer.max_iterations=1", "--quiet")
    assert status == 0
    assert out.startswith("Not converged: ")


# --- where input comes from ---------------------------------------------------------------------------------------------


def test_a_geometry_may_be_piped_in(thalweg):
    by_pipe = solved(thalweg, "-", stdin=(SAMPLES / "H2.xyz").read_bytes())
    by_name = solved(thalweg, "H2")
    assert by_pipe["energy"] == by_name["energy"]
    assert "standard" not in by_pipe["label"]


def test_a_bare_list_of_atoms_in_bohr_is_read(thalweg):
    answer = solved(thalweg, "-", "--unit", "bohr", stdin=b"H 0 0 0\nH 0 0 1.4\n")
    assert answer["reference_energy"] == pytest.approx(-1.1167, abs=5e-5)  # Szabo and Ostlund, Modern Quantum Chemistry
    assert answer["exact_energy"] == pytest.approx(-1.1373, abs=5e-5)


def test_integrals_are_solved_without_a_geometry(thalweg):
    answer = solved(thalweg, "N2_6e6o", "--set", "stop.evaluations=3")
    assert answer["spec"]["system"]["key"] == "integrals"
    assert answer["exact_energy"] == pytest.approx(-107.62184055, abs=2e-5)  # PySCF CASCI(6e,6o) at this geometry


def test_a_file_goes_before_a_sample_of_the_same_name(thalweg):
    Path("H2").write_text("He 0 0 0\n")
    assert solved(thalweg, "H2")["energy"] == pytest.approx(-2.80778396, abs=1e-6)  # helium, STO-3G, one determinant


def test_how_the_input_was_read_is_said_but_not_on_standard_output(thalweg):
    _, out, err = thalweg("solve", "H2", "--json", "-")
    assert "Sample H2.xyz" in err
    assert "0.7414 angstrom = 1.4010 bohr" in err
    json.loads(out)


# --- files --------------------------------------------------------------------------------------------------------------


def test_a_session_grows_by_a_run_and_repeats(thalweg):
    assert thalweg("solve", "H2", "--save", "study.json", "--quiet")[0] == 0
    assert thalweg("solve", "study.json", "--encoding", "parity", "--save", "study.json", "--quiet")[0] == 0
    session = load_session(Path("study.json"))
    assert [run.number for run in session.runs] == [1, 2]
    assert session.runs[1].result.spec.encoding.key == "parity"
    assert session.runs[1].result.spec.system == session.runs[0].result.spec.system
    status, out, _ = thalweg("check", "study.json", "--quiet")
    assert status == 0
    assert out.count("repeats\n") == 2
    assert "Every run repeats within 1e-07." in out


def test_a_session_whose_numbers_were_changed_does_not_repeat(thalweg):
    thalweg("solve", "H2", "--save", "study.json", "--quiet")
    data = json.loads(Path("study.json").read_text())
    data["runs"][0]["result"]["energy"] += 1e-4
    Path("study.json").write_text(json.dumps(data))
    status, out, _ = thalweg("check", "study.json", "--quiet")
    assert status == 1
    assert "PAST TOLERANCE" in out
    assert "1.00e-4 Eh" in out
    assert thalweg("check", "study.json", "--quiet", "--tolerance", "1e-3")[0] == 0


def test_a_run_ended_by_the_clock_is_checked_over_the_iterates_that_it_made(thalweg):
    words = "--optimizer nelder-mead --set stop.seconds=0.05 --set stop.evaluations=0 --set optimizer.max_iterations=1000000 --starts 2"
    thalweg("solve", "BeH2", *words.split(), "--save", "study.json", "--quiet")
    assert load_session(Path("study.json")).runs[0].result.starts[0].stop_reason == "seconds"
    status, out, _ = thalweg("check", "study.json", "--quiet")
    assert status == 0
    assert "ended from outside" in out


def test_a_run_that_cannot_be_repeated_is_told_and_fails_the_check(thalweg):
    thalweg("solve", "H2", "--save", "study.json", "--quiet")
    data = json.loads(Path("study.json").read_text())
    data["runs"][0]["result"]["spec"]["system"]["basis"] = "no-such-basis"
    Path("study.json").write_text(json.dumps(data))
    status, out, _ = thalweg("check", "study.json", "--quiet")
    assert status == 1
    assert "cannot be repeated" in out


def test_the_example_session_that_ships_with_the_program_repeats(thalweg):
    status, out, _ = thalweg("check", str(SAMPLES / "LiH-study.thalweg.json"), "--quiet")
    assert status == 0, out


@pytest.mark.parametrize(("name", "begins"), [("c.png", b"\x89PNG"), ("c.svg", b"<?xml"), ("c.pdf", b"%PDF")])
def test_the_convergence_is_drawn(thalweg, name, begins):
    assert thalweg("solve", "H2", "--figure", name, "--quiet")[0] == 0
    content = Path(name).read_bytes()
    assert content.startswith(begins)
    if name.endswith("svg"):
        assert "Chemical accuracy" in content.decode()
        assert "Hartree-Fock" in content.decode()


def test_the_json_goes_into_a_file_beside_the_printed_answer(thalweg):
    _, out, _ = thalweg("solve", "H2", "--json", "answer.json", "--quiet")
    assert out.startswith("Reaches")
    assert json.loads(Path("answer.json").read_text()).keys() >= PROMISED


# --- inspect, samples, help ---------------------------------------------------------------------------------------------


def test_inspect_states_the_figures_and_minimises_nothing(thalweg):
    status, out, _ = thalweg("inspect", "LiH", "--json", "-")
    figures = json.loads(out)
    assert status == 0
    assert (figures["n_electrons"], figures["n_orbitals"], figures["sector_dimension"]) == (4, 6, 225)
    assert (figures["qubits"], figures["qubits_before_tapering"]) == (8, 12)
    assert figures["memory_bytes"] > 0
    assert "energy" not in figures
    status, out, _ = thalweg("inspect", "LiH", "--quiet")
    for word in ("Electrons", "Orbitals", "Qubits", "Pauli terms", "One-norm", "Sector", "Memory", "Orbital     Energy/Eh"):
        assert word in out


def facts_of(out: str) -> dict[str, str]:
    return {name.strip(): text.strip() for name, _, text in (line.partition("  ") for line in out.splitlines())}


def test_facts_carry_their_units(thalweg):
    molecule = facts_of(thalweg("inspect", "H2", "--quiet")[1])
    assert molecule["Nuclear repulsion"] == "0.71375399 Eh"
    assert molecule["HOMO-LUMO gap"].endswith(" Eh")
    assert molecule["Hartree-Fock"].endswith(" Eh")
    assert molecule["Mean field converged"] == "yes"
    lattice = facts_of(thalweg("inspect", "hubbard_dimer", "--quiet")[1])
    assert lattice["Reference energy per site"].endswith(" t")
    assert lattice["One-norm"].endswith(" t")


def test_a_lattice_is_solved_in_the_unit_of_its_couplings(thalweg):
    status, out, _ = thalweg("solve", "hubbard_dimer", "--quiet")
    assert status == 0
    assert facts_of(out)["Energy"].split("  ")[0].endswith(" t")
    assert "mEh" not in out


def test_samples_lists_every_sample_with_what_it_is(thalweg):
    status, out, _ = thalweg("samples")
    assert status == 0
    names = [line.split()[0] for line in out.splitlines()]
    assert {"H2", "LiH", "BeH2", "H2O", "NH3", "N2", "HF", "CH2", "H4_square", "H4_line", "H6_line", "H3+"} <= set(names)
    assert all(len(line.split()) > 4 for line in out.splitlines())


@pytest.mark.parametrize(
    "words", [["--help"], ["-h"], ["solve", "--help"], ["inspect", "--help"], ["check", "--help"], ["samples", "--help"], ["open", "--help"]]
)
def test_every_command_explains_itself(thalweg, words):
    status, out, _ = thalweg(*words)
    assert status == 0
    assert out.startswith("Usage: thalweg")


def test_the_version_is_stated(thalweg):
    assert thalweg("--version")[1].startswith("Thalweg 0.")


# --- bad input: one line, exit status 2, nothing written ------------------------------------------------------------------
