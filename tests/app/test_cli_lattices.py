"""Lattice studies from the command line, as a person would type them."""

from __future__ import annotations

import json

import pytest

from thalweg.systems.samples import list_samples

LATTICES = [sample.name for sample in list_samples() if sample.file.suffix == ".toml"]
#: The sample of 16 sites takes as long as all others together.
LARGE = "square_16_j1j2"


def test_the_ring_of_twelve_reaches_the_target(thalweg):
    status, out, _ = thalweg("solve", "ring_12_heisenberg", "--ansatz", "alternating-operators", "--quiet")
    assert status == 0
    assert out.startswith("Reaches the target of 0.00539 J")
    assert "Per site             -0.4488" in out
    assert "(exact -0.44894924)" in out  # recomputed by exact diagonalisation elsewhere
    assert "Convention           H = J sum_<ij> S_i.S_j" in out
    assert "Exact gap            0.356 J" in out
    assert "Jordan-Wigner" not in out


def test_settings_within_settings_are_reached_and_the_name_follows(thalweg):
    words = "ring_8_heisenberg --ansatz alternating-operators --set system.lattice.sites=6 --set ansatz.depth=3 --quiet --json -"
    status, out, _ = thalweg("solve", *words.split())
    answer = json.loads(out)
    assert status == 0
    assert answer["qubits"] == 6
    assert answer["parameters"] == 6
    assert answer["reached_target"]
    assert answer["label"] == "Heisenberg, ring of 6 sites"


@pytest.mark.parametrize(
    ("words", "message"),
    [
        ("--set system.lattice.site=12", "Chain or ring has no setting 'site'"),
        ("--set system.lattice.sites=many", "system.lattice.sites"),
        ("--ansatz uccsd", "spins instead of electrons"),
    ],
)
def test_what_does_not_fit_is_one_sentence(thalweg, words, message):
    status, out, err = thalweg("solve", "ring_8_heisenberg", *words.split(), "--quiet")
    assert status == 2
    assert message in err
    assert "Traceback" not in out + err


def test_a_cut_tells_its_best_parts(thalweg):
    words = ["solve", "river_crews_cut", "--ansatz", "alternating-operators", "--set", "ansatz.depth=3", "--quiet"]
    status, out, _ = thalweg(*words)
    assert status == 0
    assert "-42.00000000 units of weight, probability" in out
    assert "the lowest energy there is" in out
    assert "cut of weight 42 | part 0: " in out


@pytest.mark.parametrize("name", [name for name in LATTICES if name != LARGE])
def test_every_lattice_sample_runs_with_two_layers(thalweg, name):
    words = ["solve", name, "--ansatz", "alternating-operators", "--set", "ansatz.depth=2", "--set", "stop.evaluations=30", "--quiet", "--json", "-"]
    status, out, err = thalweg(*words)
    assert status == 0, err
    answer = json.loads(out)
    assert answer["exact_energy"] - 1e-9 <= answer["energy"]
    assert answer["exact_gap"] > 0
    assert answer["fidelity"] is not None
    assert answer["system_facts"]["convention"]
    assert answer["system_facts"]["energy per site"] == pytest.approx(answer["energy"] / answer["system_facts"]["sites"])
