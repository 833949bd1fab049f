"""A reference typed by the person, in place of the system's own: one determinant or basis state, or a small combination of them."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian, Sector, WeightedDeterminant
from thalweg.operators.pauli import basis_matrix
from thalweg.operators.slater_condon import determinant_matrix
from thalweg.systems.combination import Combination, combination_text, read_combination
from thalweg.systems.prepared import PreparedSystem
from thalweg.systems.spin_reference import SpinReference, bit_text, parse_bits

FORMS = "one sign for each orbital (2 pair, a or b one electron, 0 empty), or two signs 0 or 1 for each (alpha, then beta)"


def with_reference(prepared: PreparedSystem, text: str) -> PreparedSystem:
    """The system with the reference that `text` names; its energy replaces that of the mean field as the reference energy.

    Electrons: one sign an active orbital, orbital 0 first, as in `22ab00`; or one bit a spin orbital, alpha before beta.
    Spins: one bit a site, site 0 first; 1 is spin down. A combination is a sum of these with amplitudes, as in
    `0.9*2200 - 0.4*2020`, which is normalised, or a list, as in `2200, 2020`: the lowest state of H among those listed.
    Raises StudyError where the text does not fit the system or its sector.
    """
    if prepared.fermions is not None:
        return _of_electrons(prepared, prepared.fermions, text)
    return _of_spins(prepared, text)


def _of_electrons(prepared: PreparedSystem, hamiltonian: FermionHamiltonian, text: str) -> PreparedSystem:
    sector = hamiltonian.sector
    found = read_combination(text, lambda part: read_determinant(part, sector))
    if found.is_single:
        changed = replace(hamiltonian, reference=found.states[0], reference_terms=())
        name = f"determinant {determinant_text(found.states[0], sector.n_orbitals)}"
        return replace(prepared, fermions=changed, reference_name=name, reference_energy=changed.reference_energy)
    _refuse_mixed_symmetries(hamiltonian, found.states)
    amplitudes = found.amplitudes_in(determinant_matrix(hamiltonian, found.states))
    terms = tuple(WeightedDeterminant(float(c), *masks) for c, masks in zip(amplitudes, found.states, strict=True) if c)
    changed = replace(hamiltonian, reference=terms[0][1:], reference_terms=terms)
    shown = combination_text([(t.amplitude, determinant_text((t.alpha, t.beta), sector.n_orbitals)) for t in terms])
    return replace(prepared, fermions=changed, reference_name=shown, reference_energy=changed.reference_energy)


def _of_spins(prepared: PreparedSystem, text: str) -> PreparedSystem:
    expansion = prepared.spins
    assert expansion is not None
    count = expansion.n_qubits
    found = read_combination(text, lambda part: _read_bits(part, count))
    bare = replace(prepared, reference_bits=found.states[0], reference_pairs=(), reference_terms=())
    if found.is_single:
        name = f"basis state {bit_text(found.states[0], count)}"
        energy = SpinReference(name, "bits", found.states[0]).energy(expansion)
        return replace(bare, reference_name=name, reference_energy=energy, reference_kind="bits")
    matrix = basis_matrix(expansion, found.states)
    amplitudes = found.amplitudes_in(_real(matrix, found))
    energy = float((amplitudes @ matrix @ amplitudes).real)
    terms = tuple((float(c), bits) for c, bits in zip(amplitudes, found.states, strict=True) if c)
    shown = combination_text([(c, bit_text(bits, count)) for c, bits in terms])
    return replace(bare, reference_name=shown, reference_energy=energy, reference_kind="combination", reference_terms=terms)


def _refuse_mixed_symmetries(hamiltonian: FermionHamiltonian, states: tuple[tuple[int, int], ...]) -> None:
    names = hamiltonian.irrep_names
    irreps = [hamiltonian.irrep_of(*masks) for masks in states]
    if len(set(irreps)) == 1:
        return
    other = next(i for i, irrep in enumerate(irreps) if irrep != irreps[0])
    shown = [names[irreps[i]] if irreps[i] < len(names) else f"irrep {irreps[i] + 1}" for i in (0, other)]
    texts = [determinant_text(states[i], hamiltonian.n_orbitals) for i in (0, other)]
    raise StudyError(
        "The determinants have different symmetries",
        f"{texts[0]} has {shown[0]} and {texts[1]} has {shown[1]}, which no eigenstate mixes",
        "Leave out those of the other symmetry",
        "reference",
    )


def _real(matrix: np.ndarray, found: Combination[int]) -> FloatArray:
    """The real part; StudyError where amplitudes are to be found and would be complex."""
    if not found.amplitudes and np.abs(matrix.imag).max(initial=0.0) > 1e-12:
        raise StudyError(
            "The amplitudes of this reference would be complex",
            "the Hamiltonian couples the listed basis states by imaginary numbers, and references are real",
            "Write the amplitudes, as in 0.8*0110 - 0.6*1001",
            "reference",
        )
    real: FloatArray = np.ascontiguousarray(matrix.real)
    return real


def _read_bits(text: str, count: int) -> int:
    try:
        return parse_bits(text, count)
    except StudyError as error:
        raise StudyError(error.what, error.why, error.fix, "reference") from None


def read_determinant(text: str, sector: Sector) -> tuple[int, int]:
    """Occupied (alpha, beta) masks; StudyError where the text is no occupation, or has other electrons than the sector."""
    signs = "".join(text.lower().split())
    m = sector.n_orbitals
    if len(signs) == m and not set(signs) - set("02ab"):
        alpha = sum(1 << p for p, sign in enumerate(signs) if sign in "2a")
        beta = sum(1 << p for p, sign in enumerate(signs) if sign in "2b")
    elif len(signs) == 2 * m and not set(signs) - set("01"):
        alpha = sum(1 << p for p in range(m) if signs[2 * p] == "1")
        beta = sum(1 << p for p in range(m) if signs[2 * p + 1] == "1")
    else:
        raise StudyError("The reference does not fit", f"'{text[:40]}' is not an occupation of {m} orbitals", f"Write {FORMS}", "reference")
    found = alpha.bit_count(), beta.bit_count()
    if found != (sector.n_alpha, sector.n_beta):
        why = f"it has {found[0]} alpha and {found[1]} beta electrons where the system has {sector.n_alpha} and {sector.n_beta}"
        raise StudyError("The reference lies in another sector", why, "Move electrons until both numbers agree", "reference")
    return alpha, beta


def determinant_text(masks: tuple[int, int], n_orbitals: int) -> str:
    """One sign an orbital, orbital 0 first."""
    return "".join("0ab2"[(masks[0] >> p & 1) + 2 * (masks[1] >> p & 1)] for p in range(n_orbitals))
