"""Alternating operators: the parts of the Hamiltonian, each exponentiated in turn, layer after layer."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import ClassVar, Literal

import numpy as np

from thalweg.ansatz import mixers
from thalweg.ansatz.commuting_groups import TermGroup, by_bond, by_flip, by_type, exchange_bonds
from thalweg.ansatz.ground import Ground
from thalweg.ansatz.preparation import reference_program
from thalweg.ansatz.starts import start_angles
from thalweg.arrays import FloatArray, IntArray
from thalweg.circuit.program import Gate, GateProgram
from thalweg.errors import StudyError
from thalweg.options import Options, option

#: Sum in radians of the rotation angles that a full step of the ramp turns one site by, and the angle of a full step of a mixer:
#: near the best ones of Zhou et al. 2020 for cuts of a ring, and small enough for lattices with many bonds at a site.
RAMP_STEP, MIXER_STEP = 2.4, 1.2
#: Initial states that have a name.
NAMED_STATES = {"plus": "all plus", "singlets": "dimer singlets"}
#: Parts of a layer that its description names.
NAMED_PARTS = 6
SPLIT_HELP = (
    "`bonds` keeps the terms of one bond together and colours the bonds, so that S_z or total spin is kept where the Hamiltonian keeps it; "
    "`types` takes terms of X, of Y and of Z apart. Electrons: terms that move the same occupations stay together."
)
MIXER_HELP = (
    "For a diagonal cost: X on every site, from the all-plus state; or XX + YY around a ring, which keeps the number of ones, from a bit string."
)
INITIAL_HELP = (
    "`fitting`: all plus or a bit string by the mixer of a diagonal cost, dimer singlets for antiferromagnetic exchange, otherwise the "
    "system's reference; `reference`: always that of the system."
)
START_HELP = "Angles that grow from layer to layer as in slow annealing, zero, normal of width 0.1, or uniform over the whole circle."


@dataclass(frozen=True)
class _Turn:
    """One group in a layer. Groups of one `block` share their angles; `scale` makes its strongest term rotate by the angle itself."""

    group: TermGroup
    block: int
    is_driver: bool  # leaves the initial state as it is

    @property
    def factors(self) -> FloatArray:
        factors: FloatArray = self.group.coefficients / self.group.largest
        return factors


class AlternatingOperators(Options):
    """Settings of the alternating operators.

    Sources: Farhi, Goldstone and Gutmann 2014 for a cost and a mixer; Hadfield et al. 2019 for other mixers; Wecker, Hastings and
    Troyer 2015 for the parts of a Hamiltonian.
    """

    title: ClassVar[str] = "Alternating operators"
    about: ClassVar[str] = (
        "Few parameters, and the symmetries are kept; needs enough layers for correlations to spread (Farhi et al. 2014; Wecker et al. 2015)."
    )
    depth_field: ClassVar[str] = "depth"

    key: Literal["alternating-operators"] = "alternating-operators"
    depth: int = option(6, "Depth", "Number of layers p; each exponentiates every part of the Hamiltonian once.", ge=1, le=200)
    split: Literal["bonds", "types"] = option("bonds", "Split", SPLIT_HELP)
    mixer: Literal["transverse", "ring"] = option("transverse", "Mixer", MIXER_HELP)
    multi_angle: bool = option(
        False, "Angle a term", "Give every term (or bond) of a part an angle of its own, instead of one for the whole part (Herrman et al. 2022)."
    )
    initial: Literal["fitting", "reference"] = option("fitting", "Initial state", INITIAL_HELP)
    start: Literal["ramp", "zero", "small-random", "uniform-random"] = option("ramp", "Start", START_HELP)

    def build(self, ground: Ground) -> GateProgram:
        """The initial state, then `depth` layers. StudyError where the mixer cannot act on the initial state."""
        turns = self._turns(ground)
        numbers = self._angle_numbers(turns)
        a_layer = sum(self._angles_a_block(turns))
        x = np.concatenate([turn.group.x for turn in turns])
        z = np.concatenate([turn.group.z for turn in turns])
        factor = np.concatenate([turn.factors for turn in turns])
        return reference_program(self._initial(ground)).followed_by(
            Gate.ROTATION,
            np.tile(x, self.depth),
            np.tile(z, self.depth),
            np.concatenate([numbers + layer * a_layer for layer in range(self.depth)]),
            np.tile(factor, self.depth),
            [f"{label} in layer {layer + 1}" for layer in range(self.depth) for label in self._labels(turns)],
            self._order(ground, turns),
        )

    def start_parameters(self, ground: Ground, program: GateProgram, rng: np.random.Generator) -> FloatArray:
        """Angles in radians, shape (K,): each the rotation angle of the strongest term of its part.

        The ramp follows H(s) = drivers + s (H - drivers), or (1 - s) mixer + s cost, in steps of equal time. Where the optimiser has
        turned rotations into gates of another kind, it has no meaning and the start is small and random.
        """
        turns = self._turns(ground)
        counts = self._angles_a_block(turns)
        if self.start != "ramp" or program.n_parameters != self.depth * sum(counts):
            return start_angles("small-random" if self.start == "ramp" else self.start, program.n_parameters, rng)
        has_mixer = self._has_mixer(ground)
        step = RAMP_STEP / _largest_on_a_site(ground)
        angles: list[float] = []
        for layer in range(self.depth):
            share = (layer + 0.5) / self.depth
            for block, count in enumerate(counts):
                turn = next(t for t in turns if t.block == block)
                size = MIXER_STEP if has_mixer and turn.is_driver else step * turn.group.largest
                part = (1.0 - share if has_mixer else 1.0) if turn.is_driver else share
                angles += [size * part] * count
        return np.array(angles)

    def from_shallower(self, parameters: FloatArray, n_parameters: int) -> FloatArray:
        """Angles of a deeper circuit, interpolated between the layers of a shallower one (Zhou, Wang, Choi, Pichler and Lukin 2020).

        They continue the optimum as a schedule and are not the same state.
        """
        a_layer = n_parameters // self.depth
        rows = np.asarray(parameters, float).reshape(-1, a_layer)
        while len(rows) < self.depth:
            p = len(rows)
            weight = np.arange(p + 1)[:, None] / p
            padded = np.vstack([np.zeros((1, a_layer)), rows, np.zeros((1, a_layer))])
            rows = weight * padded[:-1] + (1.0 - weight) * padded[1:]
        interpolated: FloatArray = rows.ravel()
        return interpolated

    def begins_elsewhere(self, ground: Ground) -> str:
        """The state that the circuit begins with in place of the reference, in words; empty where it begins with the reference."""
        state = self._initial(ground)
        if (state.reference_kind, state.reference_bits) == (ground.reference_kind, ground.reference_bits):
            return ""
        return NAMED_STATES.get(state.reference_kind, f"the bit string {_bits_of(state)}")

    def _turns(self, ground: Ground) -> list[_Turn]:
        """The groups of one layer in order of action: those of which the initial state is no eigenstate first."""
        state = self._initial(ground)
        if self._has_mixer(ground):
            cost = by_type(ground.qubits)
            mixing = mixers.transverse(ground.qubits.n_qubits) if self.mixer == "transverse" else mixers.ring(ground.qubits.n_qubits)
            return [_Turn(group, i, False) for i, group in enumerate(cost)] + [_Turn(group, len(cost), True) for group in mixing]
        if self.split == "types":
            groups = by_type(ground.qubits)
        else:
            groups = by_flip(ground.qubits) if ground.fermions is not None else by_bond(ground.qubits, state.reference_pairs)
        groups.sort(key=lambda group: _is_kept(group, state))
        return [_Turn(group, i, _is_kept(group, state)) for i, group in enumerate(groups)]

    def _has_mixer(self, ground: Ground) -> bool:
        return ground.fermions is None and not ground.qubits.x.any() and bool(ground.qubits.z.any())

    def _angles_a_block(self, turns: list[_Turn]) -> list[int]:
        """Angles of each block in one layer."""
        counts: dict[int, int] = {}
        for turn in turns:
            counts[turn.block] = counts.get(turn.block, 0) + turn.group.n_cells if self.multi_angle else 1
        return [counts[block] for block in sorted(counts)]

    def _angle_numbers(self, turns: list[_Turn]) -> IntArray:
        """The angle of each string of a layer, counted from the first of the layer."""
        if not self.multi_angle:
            return np.repeat([turn.block for turn in turns], [turn.group.x.size for turn in turns]).astype(np.int64)
        begins = np.cumsum([0] + [turn.group.n_cells for turn in turns])
        return np.concatenate([turn.group.cell + first for turn, first in zip(turns, begins.tolist(), strict=False)]).astype(np.int64)

    def _labels(self, turns: list[_Turn]) -> list[str]:
        """One text for each angle of a layer."""
        if self.multi_angle:
            return [name for turn in turns for name in turn.group.cell_labels()]
        blocks = {turn.block: turn.group.label for turn in reversed(turns)}
        return [blocks[block] for block in sorted(blocks)]

    def _initial(self, ground: Ground) -> Ground:
        """The ground with the reference that the circuit begins with."""
        n = ground.qubits.n_qubits
        if self.initial == "reference" or ground.fermions is not None:
            return ground
        if self._has_mixer(ground):
            if self.mixer == "transverse":
                return replace(ground, reference_kind="plus", reference_pairs=(), reference_terms=())
            if ground.begins_combined:
                return ground
            bits = ground.reference_bits if ground.reference_kind == "bits" else sum(1 << q for q in range(1, n, 2))
            if bits.bit_count() in (0, n):
                raise _nothing_to_mix()
            return replace(ground, reference_kind="bits", reference_bits=bits, reference_pairs=())
        pairs = _fitting_pairs(ground)
        return replace(ground, reference_kind="singlets", reference_pairs=pairs) if pairs else ground

    def _order(self, ground: Ground, turns: list[_Turn]) -> str:
        state = self._initial(ground)
        whole = "the combination of the reference" if state.begins_combined else "the basis state of the reference"
        begins = NAMED_STATES.get(state.reference_kind, whole)
        if self._has_mixer(ground) and self.mixer == "ring" and self.initial == "fitting" and not state.begins_combined:
            begins = f"the bit string {_bits_of(state)}"
        named = [turn.group.label for turn in turns[:NAMED_PARTS]]
        named += [f"{len(turns) - NAMED_PARTS} more parts"] if len(turns) > NAMED_PARTS else []
        angle = "an angle for each term" if self.multi_angle else "one angle for each part"
        return f"from {begins}, {self.depth} times: {', then '.join(named)}; {angle}"


def _bits_of(ground: Ground) -> str:
    from thalweg.systems.spin_reference import bit_text

    return bit_text(ground.reference_bits, ground.qubits.n_qubits)


def _fitting_pairs(ground: Ground) -> tuple[tuple[int, int], ...]:
    """A dimer covering along antiferromagnetic bonds for isotropic exchange alone, where the reference has S_z = 0; else empty.

    Exponentials of its bonds keep the total spin, so that from a Neel state, a mixture of spins, the ground state is out of reach.
    """
    from thalweg.systems.lattice_graph import Bond, pairing, unconnected

    n = ground.qubits.n_qubits
    bonds = exchange_bonds(ground.qubits)
    if ground.reference_kind != "bits" or 2 * ground.reference_bits.bit_count() != n or not bonds or min(bonds.values()) < 0:
        return ()
    graph = replace(unconnected(n, ""), bonds=tuple(Bond(a, b, weight=w) for (a, b), w in bonds.items()))
    return pairing(graph) or ()


def _largest_on_a_site(ground: Ground) -> float:
    """The largest sum of |coefficient| over the strings that act on one qubit."""
    support, sizes = ground.qubits.x | ground.qubits.z, np.abs(ground.qubits.coefficients)
    return max(float(sizes[(support >> np.uint64(q) & np.uint64(1)) == 1].sum()) for q in range(ground.qubits.n_qubits))


def _is_kept(group: TermGroup, state: Ground) -> bool:
    """Whether the initial state is an eigenstate of every string of the group."""
    if state.begins_combined:
        return False
    if state.reference_kind == "plus":
        return not group.z.any()
    if state.reference_kind != "singlets":
        return not group.x.any()
    pairs = {1 << a | 1 << b for a, b in state.reference_pairs}
    return all(support in pairs for support in (group.x | group.z).tolist())


def _nothing_to_mix() -> StudyError:
    return StudyError(
        "The ring mixer has nothing to mix",
        "it keeps the number of ones, and a bit string of equal signs is the only one with its number",
        "Choose a reference bit string with zeros and ones, or the transverse mixer",
        "ansatz.mixer",
    )
