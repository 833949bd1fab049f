"""Layers of two-site exchange rotations, which keep the number of ones and so S_z."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.ansatz.commuting_groups import sites_of
from thalweg.ansatz.ground import Ground
from thalweg.ansatz.hardware_efficient import entangled_pairs
from thalweg.ansatz.preparation import reference_program
from thalweg.ansatz.starts import PLAIN_START_HELP, PlainStart, start_angles
from thalweg.arrays import FloatArray
from thalweg.circuit.program import Gate, GateProgram
from thalweg.errors import StudyError
from thalweg.options import Options, option

_Row = tuple[int, int, int, float]  # x, z, parameter, factor


class ExchangeLayers(Options):
    """Settings of the exchange layers.

    exp(-i theta/2 (XX + YY)/2) turns |01> into |10> and leaves |00> and |11>; with exp(-i phi/2 ZZ) and rotations about Z on both
    sites it makes every two-qubit gate that keeps S_z (Barkoutsos et al. 2018; Foxen et al. 2020).
    """

    title: ClassVar[str] = "Exchange layers"
    about: ClassVar[str] = "Short gates on the bonds of a lattice that keep S_z; many parameters, and a random start may end in a local minimum."
    depth_field: ClassVar[str] = "depth"

    key: Literal["exchange-layers"] = "exchange-layers"
    depth: int = option(4, "Depth", "Number of layers; each acts once on every bond.", ge=1, le=200)
    bonds: Literal["model", "line", "ring"] = option(
        "model", "Bonds", "The pairs of sites that the Hamiltonian couples, neighbours along a line, or around a ring in the order of the sites."
    )
    generator: Literal["xx+yy", "xy-yx"] = option(
        "xx+yy", "Generator", "(XX + YY)/2, or (XY - YX)/2, which keeps amplitudes real and, without the phase, is a free-fermion gate on a line."
    )
    phase: bool = option(True, "ZZ phase", "Follow each exchange by a rotation about ZZ with an angle of its own.")
    site_phases: bool = option(
        True,
        "Site phases",
        "Begin each layer with a rotation about Z on every site: without it exchange cannot mend a reference that a spin flip changes.",
    )
    angles: Literal["bond", "set"] = option("bond", "Angles", "One for every bond of a layer, or one for each set of bonds that act at once.")
    start: PlainStart = option("small-random", "Start", PLAIN_START_HELP)

    def build(self, ground: Ground) -> GateProgram:
        """Sets of disjoint bonds, one after another, `depth` times. StudyError for electrons, for all plus and where there is no bond."""
        _refuse_unfit(ground)
        pairs, singlets = self._pairs(ground), {tuple(sorted(pair)) for pair in ground.reference_pairs}
        # a bond that already holds a singlet does nothing at first, so that it acts last
        sets = disjoint_sets([p for p in pairs if p not in singlets]) + disjoint_sets([p for p in pairs if p in singlets])
        rows: list[_Row] = []
        labels: list[str] = []
        for layer in range(self.depth):
            if self.site_phases:
                n = ground.qubits.n_qubits
                rows += [(0, 1 << q, len(labels) + q, 1.0) for q in range(n)]
                labels += [f"phase of site {q} in layer {layer + 1}" for q in range(n)]
            for number, bonds in enumerate(sets):
                self._one_set(bonds, f"in layer {layer + 1}", number, rows, labels)
        x, z, parameter, factor = zip(*rows, strict=True)
        return reference_program(ground).followed_by(Gate.ROTATION, x, z, parameter, factor, labels, self._order(sets))

    def start_parameters(self, ground: Ground, program: GateProgram, rng: np.random.Generator) -> FloatArray:
        """Angles in radians, shape (K,)."""
        return start_angles(self.start, program.n_parameters, rng)

    def from_shallower(self, parameters: FloatArray, n_parameters: int) -> FloatArray:
        """Parameters that give the state of fewer layers: the new ones, which act last, are the identity."""
        return np.concatenate([parameters, np.zeros(n_parameters - parameters.size)])

    def _pairs(self, ground: Ground) -> list[tuple[int, int]]:
        n = ground.qubits.n_qubits
        if self.bonds != "model":
            pairs = entangled_pairs(n, self.bonds)
        else:
            support = np.unique(ground.qubits.x | ground.qubits.z)
            pairs = sorted(sites_of(int(mask)) for mask in support[np.bitwise_count(support) == 2])
        if not pairs:
            raise StudyError(
                "There is no bond for an exchange",
                "the Hamiltonian couples no two sites" if self.bonds == "model" else "one site has no neighbour",
                "Take the bonds of a line, or a system with more sites",
                "ansatz.bonds",
            )
        return pairs

    def _one_set(self, bonds: list[tuple[int, int]], where: str, number: int, rows: list[_Row], labels: list[str]) -> None:
        kinds = ("exchange", "phase") if self.phase else ("exchange",)
        first = len(labels)
        if self.angles == "set":
            labels += [f"{kind} of set {number + 1} {where}" for kind in kinds]
        for i, (a, b) in enumerate(bonds):
            if self.angles == "bond":
                labels += [f"{kind} of sites {a} and {b} {where}" for kind in kinds]
            k = first if self.angles == "set" else first + i * len(kinds)
            rows += [(x, z, k, factor) for x, z, factor in self._exchange(1 << a, 1 << b)]
            if self.phase:
                rows.append((0, 1 << a | 1 << b, k + 1, 1.0))

    def _exchange(self, a: int, b: int) -> list[tuple[int, int, float]]:
        if self.generator == "xx+yy":
            return [(a | b, 0, 0.5), (a | b, a | b, 0.5)]
        return [(a | b, b, 0.5), (a | b, a, -0.5)]

    def _order(self, sets: list[list[tuple[int, int]]]) -> str:
        name = self.generator.upper().replace("+", " + ").replace("-", " - ")
        gate = f"({name})/2" + (", then ZZ" if self.phase else "")
        listed = "; ".join(" ".join(f"{a}-{b}" for a, b in bonds) for bonds in sets)
        before = "Z on every site, then " if self.site_phases else ""
        return f"{self.depth} times: {before}{gate} on the sets of bonds {listed}"


def disjoint_sets(pairs: list[tuple[int, int]]) -> list[list[tuple[int, int]]]:
    """The pairs in sets without a common site: each goes to the first set that has room."""
    sets: list[list[tuple[int, int]]] = []
    taken: list[int] = []
    for a, b in pairs:
        mask = 1 << a | 1 << b
        for i, used in enumerate(taken):
            if not used & mask:
                sets[i].append((a, b))
                taken[i] |= mask
                break
        else:
            sets.append([(a, b)])
            taken.append(mask)
    return sets


def _refuse_unfit(ground: Ground) -> None:
    if ground.fermions is not None:
        raise StudyError(
            "Exchange layers need spins",
            "the system has electrons, whose exchange between neighbouring qubits would mix the two spins",
            "Choose number-conserving layers for electrons",
            "ansatz",
        )
    if ground.reference_kind == "plus":
        raise StudyError(
            "Exchange layers cannot begin with all plus",
            "that reference is a superposition of every S_z, which exchange keeps",
            "Choose Neel, singlets or a bit string as the reference",
            "system.reference",
        )
