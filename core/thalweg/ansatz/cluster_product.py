"""What every unitary coupled cluster in product form shares: factor order, Trotter formula, tied amplitudes, starts."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.ansatz.excitations import mirror, totally_symmetric
from thalweg.ansatz.first_order import amplitudes_of, first_order_amplitudes
from thalweg.ansatz.ground import Ground
from thalweg.ansatz.starts import START_HELP, Start, start_angles
from thalweg.arrays import FloatArray
from thalweg.circuit.program import Excitation, ExcitationProgram
from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.options import Options, option

SinglesOrder = Literal["doubles-first", "singles-first", "mp2-size", "random"]
PlainOrder = Literal["listed", "mp2-size", "random"]

ORDER_HELP = "Which factors act on the reference first; the energy depends on it."
WITHIN = "in each group ascending by source orbitals, then target orbitals, alpha before beta"
#: First-order amplitudes are compared to this many decimals, so that rounding does not order equal ones.
COMPARED_DECIMALS = 8


class ClusterProduct(Options):
    """Base of the coupled cluster products; each adds `key`, its list of `excitations` and their `order`."""

    #: How the listed order is described: the groups as the list has them.
    electrons_only: ClassVar[bool] = True
    groups: ClassVar[str] = ""

    order: str
    order_seed: int = option(1, "Seed of the order", "Which random order is taken, where the factor order is random.", ge=0, advanced=True)
    trotter_steps: int = option(1, "Trotter steps", "The product is repeated this often with angles divided by as much.", ge=1, le=100, advanced=True)
    trotter_order: Literal["first", "second"] = option(
        "first", "Trotter order", "First: each step runs forward. Second: each runs forward, then backward, with half the angles.", advanced=True
    )
    start: Start = option("zero", "Start", START_HELP)

    def excitations(self, hamiltonian: FermionHamiltonian) -> tuple[list[Excitation], list[Excitation]]:
        """Doubles and singles, each in its listed order."""
        raise AssertionError(f"{type(self).__name__} lists no excitations")

    def is_tied(self) -> bool:
        """Whether mirror images under exchange of the spins share an amplitude."""
        return False

    def keeps_point_group(self) -> bool:
        """Whether excitations that are not totally symmetric are left out."""
        return False

    def layers(self) -> int:
        """How often the whole product is repeated with amplitudes of its own."""
        return 1

    def build(self, ground: Ground) -> ExcitationProgram:
        """The product for the reference of `ground`; StudyError for a system without electrons."""
        hamiltonian = fermions_of(ground, self.title)
        doubles, singles = self.excitations(hamiltonian)
        listed = singles + doubles if self.order == "singles-first" else doubles + singles
        if self.keeps_point_group():
            listed = totally_symmetric(listed, hamiltonian)
        factors = self._arranged(listed, hamiltonian)
        tied = tied_parameters(factors) if self.is_tied() else list(range(len(factors)))
        count, sequence = len(set(tied)), trotter_sequence(len(factors), self.trotter_steps, self.trotter_order)
        places = [(layer * count + tied[f], factors[f], weight) for layer in range(self.layers()) for f, weight in sequence]
        return ExcitationProgram(
            sector=hamiltonian.sector,
            reference=hamiltonian.reference,
            reference_terms=hamiltonian.reference_terms,
            excitations=tuple(e for _, e, _ in places),
            parameter=np.array([k for k, _, _ in places], np.int64),
            factor=np.array([weight for _, _, weight in places], float),
            n_parameters=count * self.layers(),
            order=self._order_text(),
            parameter_labels=self._labels(factors, tied, count),
        )

    def start_parameters(self, ground: Ground, program: ExcitationProgram, rng: np.random.Generator) -> FloatArray:
        """Amplitudes in radians, shape (K,); first-order ones fill the first layer and leave the others at zero."""
        if self.start != "mp2":
            return start_angles(self.start, program.n_parameters, rng)
        amplitudes = first_order_amplitudes(fermions_of(ground, self.title), program)
        amplitudes[program.n_parameters // self.layers() :] = 0.0
        return amplitudes

    def _arranged(self, listed: list[Excitation], hamiltonian: FermionHamiltonian) -> list[Excitation]:
        if self.order == "mp2-size":
            sizes = np.round(np.abs(amplitudes_of(hamiltonian, tuple(listed))), COMPARED_DECIMALS)
            return [listed[i] for i in np.argsort(-sizes, kind="stable").tolist()]
        if self.order == "random":
            return [listed[i] for i in np.random.default_rng(self.order_seed).permutation(len(listed)).tolist()]
        return listed

    def _order_text(self) -> str:
        if self.order == "mp2-size":
            text = f"largest first-order amplitude acts first, equal ones as listed: {self.groups}; {WITHIN}"
        elif self.order == "random":
            text = f"random order of seed {self.order_seed}"
        elif self.order == "singles-first":
            text = f"singles a, b act first, then doubles aa, bb, ab; {WITHIN}"
        else:
            text = f"{self.groups}; {WITHIN}"
        if self.layers() > 1:
            text += f"; {self.layers()} layers"
        if self.trotter_steps > 1 or self.trotter_order == "second":
            text += f"; {self.trotter_steps} Trotter step{'s' if self.trotter_steps > 1 else ''} of {self.trotter_order} order"
        return text

    def _labels(self, factors: list[Excitation], tied: list[int], count: int) -> tuple[str, ...]:
        parts: list[list[str]] = [[] for _ in range(count)]
        for k, e in zip(tied, factors, strict=True):
            parts[k].append(e.label())
        labels = ["; ".join(texts) for texts in parts]
        if self.layers() == 1:
            return tuple(labels)
        return tuple(f"{text} in layer {layer + 1}" for layer in range(self.layers()) for text in labels)


class SpinOrbitalProduct(ClusterProduct):
    """Base of the products whose excitations are not all spin symmetric and totally symmetric by themselves."""

    spin_tied: bool = option(False, "Spin-tied amplitudes", "Give mirror-image alpha and beta excitations one shared amplitude.")
    point_group: bool = option(True, "Point group", "Keep only totally symmetric excitations.")

    def is_tied(self) -> bool:
        return self.spin_tied

    def keeps_point_group(self) -> bool:
        return self.point_group


def fermions_of(ground: Ground, title: str) -> FermionHamiltonian:
    """The electrons of the system; StudyError where it has spins instead."""
    if ground.fermions is None:
        raise StudyError(f"No {title} for this system", "it has spins instead of electrons", "Choose another trial state", "ansatz.key")
    return ground.fermions


def tied_parameters(factors: list[Excitation]) -> list[int]:
    """The parameter of each factor, one for an excitation and its mirror image under exchange of the spins."""
    known: dict[Excitation, int] = {}
    count = 0
    for e in factors:
        known[e] = known.get(mirror(e), count)
        count = max(count, known[e] + 1)
    return [known[e] for e in factors]


def trotter_sequence(n_factors: int, steps: int, order: Literal["first", "second"]) -> list[tuple[int, float]]:
    """(factor, weight of its angle) in order of action, equal neighbours joined (Suzuki 1976)."""
    forward = list(range(n_factors))
    if order == "first":
        return [(f, 1.0 / steps) for f in forward * steps]
    joined: list[tuple[int, float]] = []
    for f in (forward + forward[::-1]) * steps:
        if joined and joined[-1][0] == f:
            joined[-1] = (f, joined[-1][1] + 0.5 / steps)
        else:
            joined.append((f, 0.5 / steps))
    return joined
