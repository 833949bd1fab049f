"""From listed integrals to a Hamiltonian with a reference determinant."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import PurePath
from typing import TYPE_CHECKING, Any

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.systems.active_space import ActiveSpace, choose_active_space, cut_degeneracies, fold_core
from thalweg.systems.fcidump import Listing, read_listing
from thalweg.systems.prepared import OrbitalRow, PreparedSystem, masks, read_only
from thalweg.watch import Watch

if TYPE_CHECKING:
    from thalweg.systems.integrals import Integrals

#: Labels are believed when no integral between different irreps is larger than this, Eh.
_FORBIDDEN_LIMIT = 1e-6
#: A reference whose orbital gradient is larger than this is not stationary, Eh.
_STATIONARY = 1e-5


@dataclass(frozen=True)
class Reference:
    """Occupation (2, 1, 0) and energies of the orbitals, shape (M,) each, and the rule that chose the occupation."""

    occupation: FloatArray
    energies: FloatArray
    rule: str


def prepare_integrals(spec: Integrals, watch: Watch, budget_bytes: int) -> PreparedSystem:
    """See `Integrals.prepare`."""
    watch.stage("reading integrals")
    if not spec.listing.strip():
        raise StudyError("There are no integrals", "the listing is empty", "Load an FCIDUMP or HDF5 file", "system.listing")
    listing = read_listing(spec.listing, budget_bytes)
    n_alpha, n_beta = _electrons(listing, spec.multiplicity)
    watch.check()
    irreps, remarks = _irreps(listing)
    two_body = listing.two_body.copy()
    one_body = listing.one_body.copy()
    dropped = _drop_forbidden(one_body, two_body, irreps)
    whole = _hamiltonian(listing, one_body, two_body, irreps, Sector(listing.n_orbitals, n_alpha, n_beta))
    reference = choose_reference(whole, listing.orbital_energies)
    watch.check()
    space = choose_active_space(spec.active_space, reference.occupation, reference.energies, None)
    core_energy, one_body, two_body = fold_core(listing.core_energy, one_body, two_body, space)
    active = list(space.active)
    fermions = FermionHamiltonian(
        core_energy=core_energy,
        one_body=read_only(one_body),
        two_body=read_only(two_body),
        orbital_irreps=read_only(irreps[active]),
        sector=Sector(len(active), space.n_alpha, space.n_beta),
        reference=masks(reference.occupation[active]),
        orbital_energies=read_only(reference.energies[active]),
        irrep_names=whole.irrep_names,
    )
    return PreparedSystem(
        label=spec.name.strip() or PurePath(spec.source).stem or "Integrals",
        fermions=fermions,
        spins=None,
        energy_unit="hartree",
        reference_name="Reference determinant",
        reference_energy=fermions.reference_energy,
        facts=_facts(spec, listing, reference, space, fermions, dropped),
        warnings=(*listing.notes, *remarks, *_warnings(listing, whole, reference, space)),
        ladder=_ladder(reference, space, irreps, whole.irrep_names),
    )


def choose_reference(hamiltonian: FermionHamiltonian, listed_energies: FloatArray) -> Reference:
    """Aufbau by the listed orbital energies; without them the lower of the listing's order and aufbau by the Fock matrix's diagonal."""
    sector = hamiltonian.sector
    if listed_energies.size:
        occupation = _aufbau(listed_energies, sector)
        return Reference(occupation, listed_energies, "lowest listed orbital energies")
    first = _aufbau(np.arange(sector.n_orbitals, dtype=float), sector)
    candidates = [(first, "first orbitals of the listing")]
    occupation = first
    for _ in range(20):
        following = _aufbau(_mean_diagonal(hamiltonian, occupation), sector)
        if np.array_equal(following, occupation):
            break
        occupation = following
        candidates.append((occupation, "lowest diagonal of the Fock matrix"))
    # min keeps the first of equals: the listing's own order
    occupation, rule = min(candidates, key=lambda c: hamiltonian.determinant_energy(*masks(c[0])))
    return Reference(occupation, _mean_diagonal(hamiltonian, occupation), rule)


def fock_matrices(hamiltonian: FermionHamiltonian, occupation: FloatArray) -> tuple[FloatArray, FloatArray]:
    """F of each spin: h_pq + sum_i (pq|ii) - sum_i,same spin (pi|iq), shape (M, M) each, Eh."""
    n_alpha, n_beta = (occupation >= 1).astype(float), (occupation == 2).astype(float)
    coulomb = np.einsum("pqii,i->pq", hamiltonian.two_body, n_alpha + n_beta)
    alpha, beta = (hamiltonian.one_body + coulomb - np.einsum("piiq,i->pq", hamiltonian.two_body, n) for n in (n_alpha, n_beta))
    return alpha, beta


def orbital_gradient(hamiltonian: FermionHamiltonian, occupation: FloatArray) -> float:
    """Largest |dE/d(rotation of two orbitals)| of the determinant, Eh: sum over spins of F_pq (n_p - n_q)."""
    alpha, beta = fock_matrices(hamiltonian, occupation)
    n_alpha, n_beta = (occupation >= 1).astype(float), (occupation == 2).astype(float)
    gradient = alpha * (n_alpha[:, None] - n_alpha) + beta * (n_beta[:, None] - n_beta)
    return float(np.abs(gradient).max(initial=0.0))


def _mean_diagonal(hamiltonian: FermionHamiltonian, occupation: FloatArray) -> FloatArray:
    alpha, beta = fock_matrices(hamiltonian, occupation)
    return 0.5 * (np.diag(alpha) + np.diag(beta))


def _aufbau(energies: FloatArray, sector: Sector) -> FloatArray:
    occupation = np.zeros(sector.n_orbitals)
    order = np.argsort(energies, kind="stable")
    occupation[order[: sector.n_alpha]] += 1.0
    occupation[order[: sector.n_beta]] += 1.0
    return occupation


def _electrons(listing: Listing, multiplicity: int) -> tuple[int, int]:
    unpaired = multiplicity - 1 if multiplicity else listing.ms2
    total = listing.n_electrons
    n_alpha = (total + unpaired) // 2
    why = ""
    if unpaired > total or (total - unpaired) % 2:
        why = f"the listing has {total} electrons"
    elif n_alpha > listing.n_orbitals:
        why = f"{n_alpha} alpha electrons do not fit in {listing.n_orbitals} orbitals"
    if why:
        fix = "Set another multiplicity, or 0 to take MS2 of the listing" if multiplicity else "Correct MS2 or NELEC in the listing"
        raise StudyError(f"Multiplicity {unpaired + 1} cannot be", why, fix, "system.multiplicity")
    return n_alpha, total - n_alpha


def _irreps(listing: Listing) -> tuple[IntArray, tuple[str, ...]]:
    """Labels that compose by xor, from ORBSYM counted from 1 or from 0, whichever fits the integrals; zeros when neither does."""
    none = np.zeros(listing.n_orbitals, dtype=np.int64)
    if listing.symmetry.size == 0 or np.ptp(listing.symmetry) == 0:
        return none, ()
    for labels in (listing.symmetry - 1, listing.symmetry):
        if labels.min() >= 0 and labels.max() < 8 and _largest_forbidden(listing.one_body, listing.two_body, labels) <= _FORBIDDEN_LIMIT:
            return labels, ()
    return none, ("ORBSYM does not fit the integrals and is not used",)


def _largest_forbidden(one_body: FloatArray, two_body: FloatArray, irreps: IntArray) -> float:
    one, two = _forbidden(irreps)
    largest_pair = np.abs(two_body.reshape(two.shape)[two]).max(initial=0.0)
    return max(float(np.abs(one_body[one]).max(initial=0.0)), float(largest_pair))


def _drop_forbidden(one_body: FloatArray, two_body: FloatArray, irreps: IntArray) -> float:
    """Sets integrals between different irreps to zero, in place; returns the largest of them, Eh."""
    largest = _largest_forbidden(one_body, two_body, irreps)
    one, two = _forbidden(irreps)
    one_body[one] = 0.0
    two_body.reshape(two.shape)[two] = 0.0
    return largest


def _forbidden(irreps: IntArray) -> tuple[np.ndarray, np.ndarray]:
    """Masks over (p, q) and over pairs (pq, rs), shape (M, M) and (M^2, M^2)."""
    pairs = irreps[:, None] ^ irreps[None, :]
    return pairs != 0, pairs.reshape(-1, 1) != pairs.reshape(1, -1)


def _hamiltonian(listing: Listing, one_body: FloatArray, two_body: FloatArray, irreps: IntArray, sector: Sector) -> FermionHamiltonian:
    size = 1 << int(irreps.max()).bit_length()
    names = tuple(str(label + 1) for label in range(size)) if size > 1 else ()
    return FermionHamiltonian(listing.core_energy, one_body, two_body, irreps, sector, (0, 0), listing.orbital_energies, names)


def _facts(
    spec: Integrals, listing: Listing, reference: Reference, space: ActiveSpace, fermions: FermionHamiltonian, dropped: float
) -> dict[str, Any]:
    facts: dict[str, Any] = {
        "source": spec.source,
        "described": spec.described or "; ".join(listing.comments),
        "electrons": listing.n_electrons,
        "multiplicity": int(np.sum(reference.occupation == 1)) + 1,
        "orbitals": listing.n_orbitals,
        "listed_core_energy": listing.core_energy,
        "active_space": space.rule,
        "frozen_orbitals": len(space.core),
        "active_electrons": space.n_electrons,
        "active_orbitals": len(space.active),
        "core_energy": fermions.core_energy,
        "reference_rule": reference.rule,
        "orbital_energies_by": "the listing" if listing.orbital_energies.size else "diagonal of the Fock matrix",
        "largest_dropped_integral": dropped,
    }
    if spec.stored_energies:
        facts["stored_energies"] = dict(spec.stored_energies)
    return {key: value for key, value in facts.items() if value != ""}


def _warnings(listing: Listing, whole: FermionHamiltonian, reference: Reference, space: ActiveSpace) -> tuple[str, ...]:
    found = []
    gradient = orbital_gradient(whole, reference.occupation)
    if gradient > _STATIONARY:
        found.append(f"The reference determinant is not stationary (orbital gradient {gradient:.1e} Eh): its energy is no Hartree-Fock energy")
    label = int(np.bitwise_xor.reduce(whole.orbital_irreps[reference.occupation == 1], initial=0))
    if whole.irrep_names and listing.target_symmetry and listing.target_symmetry != label + 1:
        found.append(f"The listing asks for irrep {listing.target_symmetry}, but the reference determinant has irrep {label + 1}")
    return (*found, *cut_degeneracies(space, reference.energies))


def _ladder(reference: Reference, space: ActiveSpace, irreps: IntArray, names: tuple[str, ...]) -> tuple[OrbitalRow, ...]:
    active, core = set(space.active), set(space.core)
    return tuple(
        OrbitalRow(
            p + 1,
            float(reference.energies[p]),
            float(reference.occupation[p]),
            names[int(irreps[p])] if names else "",
            p in active,
            p in core,
        )
        for p in range(irreps.size)
    )
