"""Pools of operators on qubits from which an adaptive trial state grows."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from thalweg.ansatz.excitations import generalised_doubles, generalised_singles
from thalweg.ansatz.ground import Ground
from thalweg.arrays import FloatArray, MaskArray
from thalweg.circuit.program import Excitation, Gate, GateProgram
from thalweg.errors import StudyError
from thalweg.operators.pauli import PauliExpansion, pauli_label

#: Operators that a pool may hold.
MAX_POOL = 100_000


@dataclass(frozen=True)
class StringPool:
    """Operators that are sums of commuting Pauli strings: prod_j exp(-i weight_j theta/2 P_j).

    Attributes:
        labels: one an operator.
        x, z, weights: the strings of all operators, one after another.
        owner: the operator that each string belongs to, ascending.
    """

    labels: tuple[str, ...]
    x: MaskArray
    z: MaskArray
    weights: FloatArray
    owner: np.ndarray

    def __len__(self) -> int:
        return len(self.labels)

    def slopes(self, of_strings: FloatArray) -> FloatArray:
        """Derivative along each operator, shape (len(self),), from those along the rotations about each string."""
        return np.bincount(self.owner, weights=self.weights * of_strings, minlength=len(self)).astype(float)

    def grown(self, program: GateProgram, chosen: list[int]) -> GateProgram:
        """The program with these operators appended, each with a parameter of its own."""
        rows = [np.flatnonzero(self.owner == i) for i in chosen]
        numbers = np.arange(program.n_parameters, program.n_parameters + len(chosen))
        place = np.concatenate(rows)
        parameter = np.repeat(numbers, [r.size for r in rows])
        labels = [self.labels[i] for i in chosen]
        return program.followed_by(Gate.ROTATION, self.x[place], self.z[place], parameter, self.weights[place], labels)


def qubit_excitations(ground: Ground) -> StringPool:
    """Generalised singles and doubles of qubit operators: the parity strings of the fermionic ones are left out.

    Source: Yordanov, Armaos, Barnes and Arvidsson-Shukur 2021. They flip occupations of modes without a sign, whatever the
    encoding; those that leave the sector that tapering kept are left out.
    """
    excitations = _distinct(ground)
    x, z, weights, owner = _strings(ground, excitations)
    kept, owner = np.unique(owner, return_inverse=True)
    # exp(theta i c P) = exp(-i (-2 c theta)/2 P)
    return StringPool(tuple(f"qubits {excitations[i].label()}" for i in kept), x, z, -2.0 * weights, owner)


def pauli_strings(ground: Ground) -> StringPool:
    """The single Pauli strings that the qubit excitations are made of (Tang et al. 2021), each once."""
    x, z, _, _ = _strings(ground, _distinct(ground))
    return _single_strings(x, z)


def hamiltonian_terms(ground: Ground) -> StringPool:
    """The strings of H, and those of the commutators of its terms, each once.

    At a real state a real H has no slope along its own strings, which have an even number of Y: there the commutators
    (nested commutators as in Claeys, Pandey, Sels and Polkovnikov 2019) begin.
    """
    h = ground.qubits
    keep = (h.x | h.z) != 0
    x, z = h.x[keep], h.z[keep]
    found = x, z
    for a, b in zip(x, z, strict=True):
        clash = ((np.bitwise_count(x & b) + np.bitwise_count(z & a)) & 1).astype(bool)
        found = np.concatenate([found[0], x[clash] ^ a]), np.concatenate([found[1], z[clash] ^ b])
        if found[0].size > MAX_POOL:
            found = _once(*found)
        if found[0].size > MAX_POOL:
            raise _too_large(h)
    return _single_strings(*found)


def _distinct(ground: Ground) -> list[Excitation]:
    """Generalised singles and doubles whose source and target share no spin orbital."""
    if ground.fermions is None or ground.encoded is None:
        raise StudyError(
            "This pool needs electrons", "the system has spins instead", "Choose the pool of Hamiltonian terms, for spin models", "ansatz.pool"
        )
    m = ground.fermions.n_orbitals
    every = generalised_singles(m) + generalised_doubles(m)
    return [e for e in every if not set(e.alpha_source) & set(e.alpha_target) and not set(e.beta_source) & set(e.beta_target)]


def _strings(ground: Ground, excitations: list[Excitation]) -> tuple[MaskArray, MaskArray, FloatArray, np.ndarray]:
    """x, z, c, owner on the working register of the generators without parity strings."""
    from thalweg.circuit.compile import excitation_strings

    assert ground.encoded is not None
    linear = ground.encoded.linear
    assert linear is not None
    signless = replace(linear, parity=np.zeros_like(linear.parity))
    return excitation_strings(tuple(excitations), signless, ground.encoded.tapering)


def _single_strings(x: MaskArray, z: MaskArray) -> StringPool:
    x, z = _once(x, z)
    labels = tuple(pauli_label(a, b) for a, b in zip(x.tolist(), z.tolist(), strict=True))
    return StringPool(labels, x, z, np.ones(x.size), np.arange(x.size))


def _once(x: MaskArray, z: MaskArray) -> tuple[MaskArray, MaskArray]:
    """Each pair of masks once, ascending by x, then z."""
    order = np.lexsort((z, x))
    x, z = x[order], z[order]
    first = np.ones(x.size, bool)
    first[1:] = (x[1:] != x[:-1]) | (z[1:] != z[:-1])
    return x[first], z[first]


def _too_large(hamiltonian: PauliExpansion) -> StudyError:
    return StudyError(
        "The pool of Hamiltonian terms is too large",
        f"{len(hamiltonian):,} terms have more than {MAX_POOL:,} different commutators",
        "Choose another pool, or study a smaller system",
        "ansatz.pool",
    )
