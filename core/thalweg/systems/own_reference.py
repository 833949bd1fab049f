"""A reference determinant or basis state typed by the person, in place of the system's own."""

from __future__ import annotations

from dataclasses import replace

from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.systems.prepared import PreparedSystem
from thalweg.systems.spin_reference import SpinReference, bit_text, parse_bits

FORMS = "one sign for each orbital (2 pair, a or b one electron, 0 empty), or two signs 0 or 1 for each (alpha, then beta)"


def with_reference(prepared: PreparedSystem, text: str) -> PreparedSystem:
    """The system with the reference that `text` names; its energy replaces that of the mean field as the reference energy.

    Electrons: one sign an active orbital, orbital 0 first, as in `22ab00`; or one bit a spin orbital, alpha before beta.
    Spins: one bit a site, site 0 first; 1 is spin down. Raises StudyError where the text does not fit the system or its sector.
    """
    if prepared.fermions is not None:
        return _with_determinant(prepared, prepared.fermions, text)
    assert prepared.spins is not None
    count = prepared.spins.n_qubits
    try:
        bits = parse_bits(text, count)
    except StudyError as error:
        raise StudyError(error.what, error.why, error.fix, "reference") from None
    name = f"basis state {bit_text(bits, count)}"
    energy = SpinReference(name, "bits", bits).energy(prepared.spins)
    return replace(prepared, reference_name=name, reference_energy=energy, reference_bits=bits, reference_kind="bits", reference_pairs=())


def _with_determinant(prepared: PreparedSystem, hamiltonian: FermionHamiltonian, text: str) -> PreparedSystem:
    sector = hamiltonian.sector
    masks = read_determinant(text, sector)
    changed = replace(hamiltonian, reference=masks)
    name = f"determinant {determinant_text(masks, sector.n_orbitals)}"
    return replace(prepared, fermions=changed, reference_name=name, reference_energy=changed.reference_energy)


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
