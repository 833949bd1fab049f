"""The Hamiltonian on qubits, before and after tapering, with all that is needed to go between the two."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from thalweg.arrays import ComplexArray, FloatArray, MaskArray
from thalweg.encoding.linear import (
    ONE,
    LinearEncoding,
    linear_encoding,
    map_hamiltonian,
    number_operator,
    s_squared_operator,
    s_z_operator,
)
from thalweg.encoding.occupations import alpha_beta_masks, determinant_masks, interleave, occupation_text, orbital_list, order_signs
from thalweg.encoding.settings import EncodingSettings
from thalweg.encoding.symmetry import Symmetry, Tapering, commuting_z_masks, independent, lightest, sector_value, taper_by
from thalweg.operators.conserved import conserves_total_spin_along
from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.operators.pauli import PauliExpansion
from thalweg.operators.total_spin import total_s_squared, total_s_z
from thalweg.watch import SILENT, Watch

DEGENERATE_NOTE = (
    "Some orbitals are degenerate: numbers of Pauli terms, measurement groups and symmetries depend on how the degenerate pair is oriented."
)
DIAGONAL_NOTE = "The Hamiltonian is diagonal, so that every qubit is a symmetry of its own; none was removed."


@dataclass(frozen=True)
class EncodedSystem:
    """A system on qubits. `working` is the register that circuits run on.

    Attributes:
        full: all qubits.
        working: inside the sector of the reference where tapering is on, else `full`.
        symmetries: those removed, empty without tapering.
        tapering: how bits and strings of `full` are written on `working`.
        reference_bits: the reference as a basis state of the working register.
        number, s_z, s_squared: observables on the working register (hbar = 1); None where they have no meaning or leave the sector,
            for spins also where the Hamiltonian does not conserve them, or is diagonal.
        degenerate_note: a sentence where counts depend on the orientation of degenerate orbitals, else "".
        remarks: other sentences to stand beside the figures.
        linear: the encoding as masks; None for spin systems, whose qubits are the sites.
        sector: electrons and orbitals; None for spin systems.
    """

    full: PauliExpansion
    working: PauliExpansion
    symmetries: tuple[Symmetry, ...]
    tapering: Tapering
    reference_bits: int
    number: PauliExpansion | None = None
    s_z: PauliExpansion | None = None
    s_squared: PauliExpansion | None = None
    degenerate_note: str = ""
    remarks: tuple[str, ...] = ()
    linear: LinearEncoding | None = None
    sector: Sector | None = None

    def from_sector(self, vectors: FloatArray) -> ComplexArray:
        """Sector states, shape (deg, Na, Nb), on the working register, shape (deg, 2^n_working), bit q of the index = qubit q.

        Amplitudes outside the tapered sector are left out: what a row lacks of norm 1 is the weight lost.
        """
        assert self.linear is not None
        assert self.sector is not None
        alpha, beta = determinant_masks(self.sector)
        occupations = interleave(alpha)[:, None] | interleave(beta)[:, None].T << np.uint64(1)
        states = np.asarray(vectors) * order_signs(alpha, beta)
        return self._place(states.reshape(len(states), -1), self.linear.encode(occupations.ravel()))

    def from_register(self, vectors: ComplexArray) -> ComplexArray:
        """States of the full register, shape (deg, 2^n_full), on the working register; weight outside the sector is left out."""
        return self._place(np.asarray(vectors), np.arange(np.shape(vectors)[-1], dtype=np.uint64))

    def weight_outside(self, vectors: FloatArray) -> FloatArray:
        """Weight of each sector state, shape (deg,), that the working register cannot hold."""
        placed = self.from_sector(vectors)
        return np.sum(np.asarray(vectors) ** 2, axis=(1, 2)) - np.sum(np.abs(placed) ** 2, axis=1)

    def occupation_label(self, bits: int) -> str:
        """What a basis state of the working register holds.

        Fermions: the text of `occupation_text`, as for sector states. Spins: `0` or `1` a site, site 0 first.
        """
        whole = self.tapering.restore(np.array([bits], np.uint64))
        if self.linear is None or self.sector is None:
            return "".join("01"[int(whole[0]) >> q & 1] for q in range(self.full.n_qubits))
        return occupation_text(*alpha_beta_masks(int(self.linear.decode(whole)[0])), self.sector)

    def _place(self, amplitudes: np.ndarray, bits: MaskArray) -> ComplexArray:
        inside = self.tapering.holds(bits)
        placed = np.zeros((len(amplitudes), 1 << self.working.n_qubits), complex)
        placed[:, self.tapering.strip(bits[inside]).astype(np.int64)] = amplitudes[:, inside]
        return placed


def encode_fermions(hamiltonian: FermionHamiltonian, settings: EncodingSettings, watch: Watch = SILENT) -> EncodedSystem:
    """A fermionic Hamiltonian on 2 M qubits, and on fewer inside the sector of its reference determinant.

    Raises StudyError past 62 qubits, Stopped when asked to stop.
    """
    linear = linear_encoding(settings, 2 * hamiltonian.n_orbitals)
    full = map_hamiltonian(hamiltonian, linear, settings.cut, watch)
    watch.check()
    flips = full.x[np.diff(full.x, prepend=full.x[:1] ^ ONE) != 0]  # terms are sorted by x
    irreps = tuple(hamiltonian.orbital_irreps.tolist())
    frame = _frame(linear, settings.taper, hamiltonian.reference, irreps, hamiltonian.irrep_names, flips.tobytes())
    watch.check()
    working = frame.tapering.expansion(full)
    assert working is not None
    watch.check()
    return EncodedSystem(
        full,
        working,
        frame.symmetries,
        frame.tapering,
        frame.reference_bits,
        number=frame.number,
        s_z=frame.s_z,
        s_squared=frame.s_squared,
        degenerate_note=DEGENERATE_NOTE if hamiltonian.orbitals_are_degenerate() else "",
        linear=linear,
        sector=hamiltonian.sector,
    )


@dataclass(frozen=True)
class _Frame:
    """What an encoding of electrons owes to the structure of the Hamiltonian alone, not to its coefficients."""

    tapering: Tapering
    symmetries: tuple[Symmetry, ...]
    reference_bits: int
    number: PauliExpansion | None
    s_z: PauliExpansion | None
    s_squared: PauliExpansion | None


@lru_cache(maxsize=8)  # the points of a scan share their structure
def _frame(
    linear: LinearEncoding, taper: bool, reference: tuple[int, int], irreps: tuple[int, ...], irrep_names: tuple[str, ...], flips: bytes
) -> _Frame:
    """`flips`: the x masks of all terms, each once."""
    alpha, beta = (np.array([mask], np.uint64) for mask in reference)
    occupied = interleave(alpha) | interleave(beta) << ONE
    full_bits = int(linear.encode(occupied)[0])
    tapering, symmetries = _nothing_removed(linear.n_qubits)
    if taper:
        x = np.frombuffer(flips, np.uint64).copy()
        space = commuting_z_masks(PauliExpansion(linear.n_qubits, x, np.zeros_like(x), np.ones(x.size)))
        tapering, symmetries = _fermion_symmetries(linear, space, irreps, irrep_names, full_bits)
    return _Frame(
        tapering,
        symmetries,
        int(tapering.strip(np.array([full_bits], np.uint64))[0]),
        number=tapering.expansion(number_operator(linear)),
        s_z=tapering.expansion(s_z_operator(linear)),
        s_squared=tapering.expansion(s_squared_operator(linear)),
    )


def encode_spins(expansion: PauliExpansion, settings: EncodingSettings, reference_bits: int, *, may_taper: bool = False) -> EncodedSystem:
    """A spin Hamiltonian, one qubit a site.

    With `may_taper`, and where the settings ask for it, products of Z that commute with it are removed in the sector of the
    reference state. That suits circuits that know qubits only; whatever numbers the sites (pairs, preparation of
    superpositions, mixers) needs them all. A Hamiltonian without any X or Y is left whole: each qubit would be a symmetry and
    nothing would remain to be searched.
    """
    wanted, diagonal = may_taper and settings.taper, not np.any(expansion.x)
    tapering, symmetries = _nothing_removed(expansion.n_qubits)
    if wanted and not diagonal:
        masks = lightest(commuting_z_masks(expansion))
        tapering = taper_by(expansion.n_qubits, masks, reference_bits)
        symmetries = _named([(m, "parity of sites " + _counted(m)) for m in masks], tapering, reference_bits)
    working = tapering.expansion(expansion)
    assert working is not None
    along_z = not diagonal and conserves_total_spin_along(expansion, "z")  # the bits of a cost are no spins
    every_axis = along_z and conserves_total_spin_along(expansion, "x")
    return EncodedSystem(
        expansion,
        working,
        symmetries,
        tapering,
        int(tapering.strip(np.array([reference_bits], np.uint64))[0]),
        s_z=tapering.expansion(total_s_z(expansion.n_qubits)) if along_z else None,
        s_squared=tapering.expansion(total_s_squared(expansion.n_qubits)) if every_axis else None,
        remarks=(DIAGONAL_NOTE,) if wanted and diagonal else (),
    )


def _nothing_removed(n_qubits: int) -> tuple[Tapering, tuple[Symmetry, ...]]:
    return Tapering(n_qubits), ()


def _fermion_symmetries(
    linear: LinearEncoding, space: list[int], irreps: tuple[int, ...], irrep_names: tuple[str, ...], reference: int
) -> tuple[Tapering, tuple[Symmetry, ...]]:
    """Parities that have a meaning come first: alpha electrons, beta electrons, electrons in orbitals of some irreps, then the rest."""
    every = (1 << len(irreps)) - 1
    named = [(_spin_orbitals(every, 0), "parity of the alpha electrons"), (_spin_orbitals(0, every), "parity of the beta electrons")]
    for bit in range(max(irreps, default=0).bit_length()):
        odd = sum(1 << p for p, irrep in enumerate(irreps) if irrep >> bit & 1)
        if odd:
            named.append((_spin_orbitals(odd, odd), f"parity of the electrons in {_irrep_text(irreps, irrep_names, bit)}"))
    named += [(modes, _modes_text(modes)) for modes in lightest([linear.modes_of(mask) for mask in space])]
    text = {linear.z_mask(modes): label for modes, label in reversed(named)}
    masks = independent([linear.z_mask(modes) for modes, _ in named], space)
    tapering = taper_by(linear.n_qubits, masks, reference)
    return tapering, _named([(mask, text[mask]) for mask in masks], tapering, reference)


def _named(masks: list[tuple[int, str]], tapering: Tapering, reference: int) -> tuple[Symmetry, ...]:
    pairs = zip(masks, tapering.pivots, strict=False)  # one qubit may be kept back
    return tuple(Symmetry(label, mask, sector_value(mask, reference), q) for (mask, label), q in pairs)


def _modes_text(modes: int) -> str:
    alpha, beta = alpha_beta_masks(modes)
    if alpha == beta:
        return "parity of the electrons in orbitals " + _counted(alpha)
    return "parity of the electrons in spin orbitals " + orbital_list(modes)


def _spin_orbitals(alpha: int, beta: int) -> int:
    masks = interleave(np.array([alpha, beta], np.uint64))
    return int(masks[0] | masks[1] << np.uint64(1))


def _irrep_text(irreps: tuple[int, ...], names: tuple[str, ...], bit: int) -> str:
    """`B1 and B2 orbitals`, or orbital numbers where the irreps have no names."""
    labels = sorted({irrep for irrep in irreps if irrep >> bit & 1})
    if names and labels[-1] < len(names):
        return " and ".join(names[label] for label in labels) + " orbitals"
    return "orbitals " + _counted(sum(1 << p for p, irrep in enumerate(irreps) if irrep >> bit & 1))


def _counted(mask: int) -> str:
    return " ".join(str(q) for q in range(mask.bit_length()) if mask >> q & 1)
