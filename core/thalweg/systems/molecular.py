"""From the settings of a molecule to its Hamiltonian: checks, mean field, active space, integrals, figures."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.systems.active_space import ActiveSpace, choose_active_space, cut_degeneracies
from thalweg.systems.elements import Element, core_orbitals, formula
from thalweg.systems.gaussian_basis import build_mole
from thalweg.systems.geometry import check_geometry, coordinates_in_bohr, elements_of, short_distance_doubt, shortest_distance
from thalweg.systems.mean_field import solve
from thalweg.systems.orbital_following import follow, seed_of, usable_density
from thalweg.systems.orbital_order import MeanField
from thalweg.systems.prepared import MeanFieldSeed, OrbitalRow, PreparedSystem, masks, read_only
from thalweg.watch import Watch

if TYPE_CHECKING:
    from thalweg.systems.molecule import Molecule

#: Integrals between irreps whose product is not totally symmetric are zero; larger ones than this (Eh) mean wrong labels.
_FORBIDDEN_LIMIT = 1e-4
#: Fact that lists what was said when the orbitals of a neighbour were followed.
FOLLOWING = "orbital_following"
#: A frontier gap below this makes the reference one of several like determinants, Eh.
_SMALL_GAP = 1e-3


def prepare_molecule(spec: Molecule, watch: Watch, budget_bytes: int, neighbour: MeanFieldSeed | None) -> PreparedSystem:
    """See `Molecule.prepare`."""
    check_geometry(spec.atoms, spec.unit)
    elements = elements_of(spec.atoms)
    n_alpha, n_beta = _electrons(elements, spec.charge, spec.multiplicity)
    watch.stage("mean field")
    symbols = [e.symbol for e in elements]
    xyz = coordinates_in_bohr(spec.atoms, spec.unit)
    mole = build_mole(symbols, xyz, spec.basis.strip(), spec.charge, n_alpha - n_beta, spec.cartesian, spec.point_group, budget_bytes)
    n_functions = int(mole.nao_nr())
    _check_size(n_functions, mole.nelec[0], budget_bytes)
    field = solve(mole, watch, usable_density(neighbour, n_functions))
    watch.stage("integrals")
    n_core = sum(max(0, core_orbitals(e.number) - mole.atom_nelec_core(i) // 2) for i, e in enumerate(elements))
    space, following = follow(neighbour, field, choose_active_space(spec.active_space, field.occupation, field.energies, n_core))
    _check_memory(n_functions, len(space.active), budget_bytes, "system.active_space")
    core_energy, one_body, pairs = _active_integrals(field, space)
    dropped = _drop_forbidden(one_body, pairs, field.irreps[list(space.active)])
    if dropped > _FORBIDDEN_LIMIT:
        field = field.without_point_group(f"Integrals of {dropped:.1e} Eh break the point group, so the search does not use it")
        dropped = 0.0
    watch.check()
    fermions = _hamiltonian(field, space, core_energy, one_body, pairs)
    return PreparedSystem(
        label=f"{spec.name.strip() or _formula(elements, spec.charge)}, {_basis_title(spec.basis.strip())}",
        fermions=fermions,
        spins=None,
        energy_unit="hartree",
        reference_name="Hartree-Fock" if mole.spin == 0 else "Hartree-Fock (restricted open shell)",
        reference_energy=fermions.reference_energy,
        facts=_facts(spec, elements, mole, field, space, core_energy, dropped) | ({FOLLOWING: list(following)} if following else {}),
        warnings=_warnings(spec, field, space),
        ladder=_ladder(field, space),
        mean_field=field.solver,
        seed=seed_of(field, space),
    )


def _electrons(elements: tuple[Element, ...], charge: int, multiplicity: int) -> tuple[int, int]:
    """(alpha, beta) electrons; StudyError when the charge or the multiplicity cannot be."""
    total, unpaired = sum(e.number for e in elements) - charge, multiplicity - 1
    if total < 1:
        raise StudyError(f"A charge of {charge} leaves {total} electrons", "there is nothing to compute", "Lower the charge", "system.charge")
    if unpaired > total:
        raise StudyError(
            f"Multiplicity {multiplicity} needs {unpaired} unpaired electrons",
            f"the molecule has {total}",
            "Lower the multiplicity",
            "system.multiplicity",
        )
    if (total - unpaired) % 2:
        kind = "an odd" if total % 2 else "an even"
        near = f"{multiplicity - 1} or {multiplicity + 1}" if multiplicity > 1 else "2"
        raise StudyError(
            f"Multiplicity {multiplicity} cannot be",
            f"with charge {charge} there are {total} electrons, {kind} number",
            f"Set the multiplicity to {near}, or change the charge",
            "system.multiplicity",
        )
    return (total + unpaired) // 2, (total - unpaired) // 2


def _check_size(n_functions: int, n_alpha: int, budget_bytes: int) -> None:
    if n_alpha > n_functions:
        raise StudyError(
            f"{n_alpha} alpha electrons do not fit", f"the basis set has {n_functions} orbitals", "Take a larger basis set", "system.basis"
        )
    _check_memory(n_functions, 0, budget_bytes, "system.basis")


def _check_memory(n_functions: int, n_active: int, budget_bytes: int, field: str) -> None:
    """Refuses work over the budget: 8-fold integrals over functions, half-transformed ones, and three copies of M^4."""
    pairs, active_pairs = n_functions * (n_functions + 1) // 2, n_active * (n_active + 1) // 2
    needed = 4 * pairs * (pairs + 1) + 8 * pairs * active_pairs + 24 * n_active**4 + 40 * n_functions**2
    if needed > budget_bytes:
        and_active = f" and {n_active} active orbitals" if n_active else ""
        raise StudyError(
            f"The integrals need {needed / 2**30:.1f} GiB of memory",
            f"{n_functions} basis functions{and_active} exceed the budget of {budget_bytes / 2**30:.1f} GiB",
            "Take a smaller basis set or active space, or raise the memory budget",
            field,
        )


def _active_integrals(field: MeanField, space: ActiveSpace) -> tuple[float, FloatArray, FloatArray]:
    """Core energy, h (M, M) and (pq|rs) over pairs p >= q, r >= s, shape (M(M+1)/2,) * 2, Eh."""
    from pyscf import ao2mo, lib

    solver = field.solver
    active, core = field.orbitals[:, list(space.active)], field.orbitals[:, list(space.core)]
    with lib.with_omp_threads(1):
        one_body = np.asarray(solver.get_hcore(), dtype=float)
        energy = float(solver.energy_nuc())
        if space.core:
            density = 2.0 * core @ core.T
            coulomb, exchange = solver.get_jk(solver.mol, density)
            mean = coulomb - 0.5 * exchange
            energy += float(np.sum(density * (one_body + 0.5 * mean)))
            one_body = one_body + mean
        if solver._eri is None:  # PySCF keeps no integrals of a one-electron system
            solver._eri = solver.mol.intor("int2e", aosym="s8")
        pairs = ao2mo.restore(4, ao2mo.full(solver._eri, active, compact=True), active.shape[1])
    h = active.T @ one_body @ active
    return energy, 0.5 * (h + h.T), 0.5 * (pairs + pairs.T)


def _drop_forbidden(one_body: FloatArray, pairs: FloatArray, irreps: IntArray) -> float:
    """Sets integrals that the point group forbids to zero, in place; returns the largest of them, Eh. Nothing is set above the limit.

    A geometry given to finite digits breaks its group a little. The dropped part couples to other irreps only, so the energy
    changes by its square.
    """
    row, column = np.tril_indices(irreps.size)
    labels = irreps[row] ^ irreps[column]
    forbidden = ((one_body, irreps[:, None] != irreps[None, :]), (pairs, labels[:, None] != labels[None, :]))
    largest = max(float(np.abs(table[mask]).max(initial=0.0)) for table, mask in forbidden)
    if largest <= _FORBIDDEN_LIMIT:
        for table, mask in forbidden:
            table[mask] = 0.0
    return largest


def _hamiltonian(field: MeanField, space: ActiveSpace, core_energy: float, one_body: FloatArray, pairs: FloatArray) -> FermionHamiltonian:
    from pyscf import ao2mo

    active = list(space.active)
    occupation = field.occupation[active]
    return FermionHamiltonian(
        core_energy=core_energy,
        one_body=read_only(one_body),
        two_body=read_only(ao2mo.restore(1, pairs, len(active))),
        orbital_irreps=read_only(field.irreps[active]),
        sector=Sector(len(active), space.n_alpha, space.n_beta),
        reference=masks(occupation),
        orbital_energies=read_only(field.energies[active]),
        irrep_names=field.irrep_names,
    )


def _facts(
    spec: Molecule, elements: tuple[Element, ...], mole: Any, field: MeanField, space: ActiveSpace, core_energy: float, dropped: float
) -> dict[str, Any]:
    from pyscf import __version__ as version

    from thalweg.units import BOHR_IN_ANGSTROM

    pair = shortest_distance(spec.atoms, spec.unit)
    gap = _gap(field)
    facts: dict[str, Any] = {
        "formula": _formula(elements, spec.charge),
        "electrons": int(mole.nelectron),
        "charge": spec.charge,
        "multiplicity": spec.multiplicity,
        "basis": spec.basis.strip(),
        "functions": "Cartesian" if spec.cartesian else "spherical",
        "orbitals": int(field.energies.size),
        "point_group": _group_title(mole) if mole.symmetry else "not used",
        "nuclear_repulsion": float(mole.energy_nuc()),
        "shortest_distance_angstrom": pair.angstrom if pair else None,
        "shortest_distance_bohr": pair.bohr if pair else None,
        "bohr_in_angstrom": BOHR_IN_ANGSTROM,
        "active_space": space.rule,
        "frozen_orbitals": len(space.core),
        "active_electrons": space.n_electrons,
        "active_orbitals": len(space.active),
        "core_energy": core_energy,
        "mean_field": "ROHF" if mole.spin else "RHF",
        "mean_field_energy": field.energy,
        "mean_field_iterations": field.iterations,
        "mean_field_converged": field.converged,
        "mean_field_stability": field.stability,
        "homo_lumo_gap": gap,
        "largest_dropped_integral": dropped,
        "integrals_by": f"PySCF {version}",
    }
    if replaced := sum(mole.atom_nelec_core(i) for i in range(mole.natm)):
        facts["core_potential_electrons"] = int(replaced)
    return facts


def _warnings(spec: Molecule, field: MeanField, space: ActiveSpace) -> tuple[str, ...]:
    found = list(field.warnings)
    if spec.point_group and not field.solver.mol.symmetry:
        found.append("The point group of the geometry could not be worked out and is not used")
    if doubt := short_distance_doubt(spec.atoms, spec.unit):
        found.append(doubt)
    n_functions = field.orbitals.shape[0]
    if field.energies.size < n_functions:
        found.append(f"{n_functions - field.energies.size} of {n_functions} basis functions are linearly dependent and were left out")
    gap = _gap(field)
    if gap is not None and gap < _SMALL_GAP:
        found.append(f"The frontier gap is {1e3 * gap:.3f} mEh: other determinants are as good a reference as the one taken")
    return (*found, *cut_degeneracies(space, field.energies))


def _gap(field: MeanField) -> float | None:
    """Lowest empty minus highest occupied orbital energy, Eh; None when no orbital is empty."""
    empty = field.energies[field.occupation == 0]
    return float(empty.min() - field.energies[field.occupation > 0].max()) if empty.size else None


def _ladder(field: MeanField, space: ActiveSpace) -> tuple[OrbitalRow, ...]:
    active, core = set(space.active), set(space.core)
    irreps = [field.irrep_names[i] if field.irrep_names else "" for i in field.irreps.tolist()]
    return tuple(
        OrbitalRow(p + 1, float(field.energies[p]), float(field.occupation[p]), irreps[p], p in active, p in core) for p in range(field.energies.size)
    )


def _formula(elements: tuple[Element, ...], charge: int) -> str:
    size = "" if abs(charge) == 1 else str(abs(charge))
    return formula(tuple(e.symbol for e in elements)) + (f"{size}{'+' if charge > 0 else '-'}" if charge else "")


def _group_title(mole: Any) -> str:
    full = {"Dooh": "D∞h", "Coov": "C∞v", "SO3": "K"}.get(mole.topgroup, mole.topgroup)
    return full if full == mole.groupname else f"{full} (used as {mole.groupname})"


def _basis_title(basis: str) -> str:
    """As the literature writes it: STO-3G, 6-31G*, cc-pVDZ, def2-SVP."""
    lower = basis.lower()
    for prefix in ("aug-cc-p", "cc-p", "def2-"):
        if lower.startswith(prefix):
            return prefix + lower[len(prefix) :].upper()
    return basis.upper()
