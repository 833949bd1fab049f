"""Bars B9 (fermions to qubits) and B11 (measurement sets), against the openfermion library on the same Hamiltonians."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np

from thalweg.cost.groups import qubit_wise_groups
from thalweg.encoding import BravyiKitaev, JordanWigner, ParityEncoding
from thalweg.encoding.interchange import to_fermion_operator, to_qubit_operator
from thalweg.encoding.linear import linear_encoding, map_hamiltonian
from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.systems import Molecule

CUT = 1e-10
Row = dict[str, object]


def b9_mapping() -> list[Row]:
    """H2O, STO-3G: every encoding against openfermion's fastest route to it, equal results demanded; then a dense 28-qubit case."""
    import openfermion as of

    water = without_noise(molecule("H2O"))
    n = 2 * water.n_orbitals
    tensors, ladders = interaction_operator(water), to_fermion_operator(water)
    code = of.parity_code(n)
    oracles: list[tuple[Any, float, Callable[[], Any]]] = [
        (JordanWigner(), 200, lambda: of.jordan_wigner(tensors)),
        (BravyiKitaev(), 500, lambda: of.bravyi_kitaev(tensors)),
        (ParityEncoding(), 1000, lambda: of.binary_code_transform(ladders, code)),
    ]
    rows = []
    for settings, limit, oracle in oracles:
        linear = linear_encoding(settings, n)
        difference = to_qubit_operator(map_hamiltonian(water, linear, CUT)) - oracle()
        assert max((abs(c) for c in difference.terms.values()), default=0.0) < 1e-9
        ours, theirs = interleaved(lambda linear=linear: map_hamiltonian(water, linear, CUT), oracle)
        text = f"H2O mapped by {settings.title}: openfermion {theirs * 1e3:.0f} ms / Thalweg {ours * 1e6:.0f} us, at least"
        rows.append(row("B9", text, theirs / ours, limit, at_least=True))
    dense, linear = dense_hamiltonian(14), linear_encoding(BravyiKitaev(), 28)
    seconds = least(lambda: map_hamiltonian(dense, linear, CUT), 10)
    rows.append(row("B9", "28 qubits, every integral non-zero, 55,371 terms: ms, at most", seconds * 1e3, 20, at_least=False))
    return rows


def b11_qubit_wise_sets() -> list[Row]:
    """LiH and H2O, STO-3G: speed against openfermion's grouping and number of sets against the fewest that it finds with three seeds."""
    from openfermion.measurements import group_into_tensor_product_basis_sets

    rows = []
    for name in ("LiH", "H2O"):
        hamiltonian = molecule(name)
        for settings in (JordanWigner(), BravyiKitaev()):
            expansion = map_hamiltonian(hamiltonian, linear_encoding(settings, 2 * hamiltonian.n_orbitals), CUT)
            operator = to_qubit_operator(expansion)
            fewest = min(len(group_into_tensor_product_basis_sets(operator, seed=seed)) for seed in (1, 2, 3))
            count = len(qubit_wise_groups(expansion))
            ours, theirs = interleaved(
                lambda expansion=expansion: qubit_wise_groups(expansion),
                lambda operator=operator: group_into_tensor_product_basis_sets(operator, seed=1),
            )
            what = f"{name}, {settings.title}, qubit-wise sets"
            text = f"{what}: openfermion {theirs * 1e3:.0f} ms / Thalweg {ours * 1e6:.0f} us, at least"
            rows.append(row("B11", text, theirs / ours, 500, at_least=True))
            rows.append(row("B11", f"{what}: {count} against {fewest}, ratio at most", count / fewest, 1.02, at_least=False))
    return rows


def molecule(name: str) -> FermionHamiltonian:
    """The geometries of Verteletskyi, Yen and Izmaylov 2020: bonds of 1.0 angstrom, HOH 107.6 degrees; STO-3G, all electrons."""
    half = np.deg2rad(107.6) / 2
    atoms = {
        "LiH": (("Li", 0.0, 0.0, 0.0), ("H", 0.0, 0.0, 1.0)),
        "H2O": (("O", 0.0, 0.0, 0.0), ("H", 0.0, np.sin(half), np.cos(half)), ("H", 0.0, -np.sin(half), np.cos(half))),
    }[name]
    fermions = Molecule(name=name, atoms=atoms).prepare().fermions
    assert fermions is not None
    return fermions


def without_noise(hamiltonian: FermionHamiltonian) -> FermionHamiltonian:
    """Integrals that vanish by symmetry made zero, which spares openfermion work."""
    one, two = (np.where(np.abs(a) < 1e-12, 0.0, a) for a in (hamiltonian.one_body, hamiltonian.two_body))
    return replace(hamiltonian, one_body=one, two_body=two)


def dense_hamiltonian(m: int) -> FermionHamiltonian:
    """Real symmetric integrals with no zero among them."""
    rng = np.random.default_rng(1)
    h, g = rng.normal(size=(m, m)), rng.normal(size=(m,) * 4)
    for order in ((1, 0, 2, 3), (0, 1, 3, 2), (2, 3, 0, 1)):
        g = g + g.transpose(order)
    return FermionHamiltonian(0.0, h + h.T, g, np.zeros(m, np.int64), Sector(m, 1, 1), (1, 1), np.empty(0))


def interaction_operator(hamiltonian: FermionHamiltonian) -> Any:
    """openfermion's tensors: interleaved spin orbitals, g[p,q,r,s] = 1/2 (ps|qr)."""
    from openfermion import InteractionOperator
    from openfermion.chem.molecular_data import spinorb_from_spatial

    one, two = spinorb_from_spatial(hamiltonian.one_body, hamiltonian.two_body.transpose(0, 2, 3, 1))
    return InteractionOperator(hamiltonian.core_energy, one, 0.5 * two)


def interleaved(ours: Callable[[], Any], theirs: Callable[[], Any]) -> tuple[float, float]:
    """Least time of each, seconds, taken in turn."""
    pairs = [(least(ours, 20), least(theirs, 1)) for _ in range(4)]
    return min(a for a, _ in pairs), min(b for _, b in pairs)


def least(function: Callable[[], Any], repeats: int) -> float:
    found = []
    for _ in range(repeats):
        begun = time.perf_counter()
        function()
        found.append(time.perf_counter() - begun)
    return min(found)


def row(bar: str, text: str, measured: float, limit: float, *, at_least: bool) -> Row:
    met = measured >= limit if at_least else measured <= limit
    return {"bar": bar, "text": text, "measured": measured, "limit": limit, "met": met}


BARS = [b9_mapping, b11_qubit_wise_sets]
