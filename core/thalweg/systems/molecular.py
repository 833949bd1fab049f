"""From the settings of a molecule to its Hamiltonian: checks, mean field, active space, integrals, figures."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from thalweg.arrays import FloatArray, IntArray
from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.systems.active_space import ActiveSpace, choose_active_space
from thalweg.systems.elements import Element, core_orbitals
from thalweg.systems.gaussian_basis import build_mole, count_functions
from thalweg.systems.geometry import check_geometry, coordinates_in_bohr, elements_of
from thalweg.systems.mean_field import solve
from thalweg.systems.molecular_facts import basis_title, charged_formula, facts_of, ladder_of, warnings_of
from thalweg.systems.orbital_following import follow, order_facts, seed_of, usable_density
from thalweg.systems.orbital_order import MeanField
from thalweg.systems.prepared import MeanFieldSeed, PreparedSystem, masks, read_only
from thalweg.systems.wording import counted
from thalweg.watch import Watch

if TYPE_CHECKING:
    from thalweg.systems.molecule import Molecule

#: Integrals between irreps whose product is not totally symmetric are zero; larger ones than this (Eh) mean wrong labels.
_FORBIDDEN_LIMIT = 1e-4
#: Fact that lists what was said when the orbitals of a neighbour were followed.
FOLLOWING = "orbital_following"


def prepare_molecule(spec: Molecule, watch: Watch, budget_bytes: int, neighbour: MeanFieldSeed | None) -> PreparedSystem:
    """See `Molecule.prepare`."""
    check_geometry(spec.atoms, spec.unit)
    elements = elements_of(spec.atoms)
    n_alpha, n_beta = _electrons(elements, spec.charge, spec.multiplicity)
    watch.stage("mean field")
    symbols, basis = [e.symbol for e in elements], spec.basis.strip()
    _check_memory(count_functions(symbols, basis, spec.cartesian), 0, budget_bytes, "system.basis")
    xyz = coordinates_in_bohr(spec.atoms, spec.unit)
    mole = build_mole(symbols, xyz, basis, spec.charge, n_alpha - n_beta, spec.cartesian, spec.point_group, budget_bytes)
    n_functions = int(mole.nao_nr())
    _check_filling(n_functions, int(mole.nelec[0]))
    field = solve(mole, watch, usable_density(neighbour, n_functions), neighbour)
    watch.stage("integrals")
    n_core = sum(max(0, core_orbitals(e.number) - mole.atom_nelec_core(i) // 2) for i, e in enumerate(elements))
    space, field, following = follow(neighbour, field, choose_active_space(spec.active_space, field.occupation, field.energies, n_core))
    _check_memory(n_functions, len(space.active), budget_bytes, "system.active_space")
    core_energy, one_body, pairs = _active_integrals(field, space)
    dropped = _drop_forbidden(one_body, pairs, field.irreps[list(space.active)])
    if dropped > _FORBIDDEN_LIMIT:
        field = field.without_point_group(f"Integrals of {dropped:.1e} Eh break the point group, so the search does not use it")
        dropped = 0.0
    watch.check()
    fermions = _hamiltonian(field, space, core_energy, one_body, pairs)
    return PreparedSystem(
        label=f"{spec.name.strip() or charged_formula(elements, spec.charge)}, {basis_title(spec.basis.strip())}",
        fermions=fermions,
        spins=None,
        energy_unit="hartree",
        reference_name="Hartree-Fock" if mole.spin == 0 else "Hartree-Fock (restricted open shell)",
        reference_energy=fermions.reference_energy,
        facts=facts_of(spec, elements, mole, field, space, core_energy, dropped)
        | order_facts(field, space)
        | ({FOLLOWING: list(following)} if following else {}),
        warnings=warnings_of(spec, field, space),
        ladder=ladder_of(field, space),
        mean_field=field.solver,
        seed=seed_of(field, space),
    )


def _electrons(elements: tuple[Element, ...], charge: int, multiplicity: int) -> tuple[int, int]:
    """(alpha, beta) electrons; StudyError when the charge or the multiplicity cannot be."""
    total, unpaired = sum(e.number for e in elements) - charge, multiplicity - 1
    if total < 1:
        raise StudyError(f"A charge of {charge} leaves no electrons", "there is nothing to compute", "Lower the charge", "system.charge")
    if unpaired > total:
        raise StudyError(
            f"Multiplicity {multiplicity} needs {counted(unpaired, 'unpaired electron')}",
            f"the molecule has {total}",
            "Lower the multiplicity",
            "system.multiplicity",
        )
    if (total - unpaired) % 2:
        kind = "an odd" if total % 2 else "an even"
        near = f"{multiplicity - 1} or {multiplicity + 1}" if multiplicity > 1 else "2"
        raise StudyError(
            f"Multiplicity {multiplicity} cannot be",
            f"with charge {charge} the molecule has {counted(total, 'electron')}, {kind} number",
            f"Set the multiplicity to {near}, or change the charge",
            "system.multiplicity",
        )
    return (total + unpaired) // 2, (total - unpaired) // 2


def _check_filling(n_functions: int, n_alpha: int) -> None:
    if n_alpha > n_functions:
        raise StudyError(
            f"{counted(n_alpha, 'alpha electron')} do not fit",
            f"the basis set has {counted(n_functions, 'orbital')}",
            "Take a larger basis set",
            "system.basis",
        )


def _check_memory(n_functions: int, n_active: int, budget_bytes: int, field: str) -> None:
    """Refuses work over the budget: 8-fold integrals over functions, half-transformed ones, and three copies of M^4."""
    pairs, active_pairs = n_functions * (n_functions + 1) // 2, n_active * (n_active + 1) // 2
    needed = 4 * pairs * (pairs + 1) + 8 * pairs * active_pairs + 24 * n_active**4 + 40 * n_functions**2
    if needed > budget_bytes:
        and_active = f" and {n_active} active orbitals" if n_active else ""
        raise StudyError(
            f"The integrals need {needed / 2**30:.3g} GiB of memory",
            f"{n_functions} basis functions{and_active} exceed the budget of {budget_bytes / 2**30:.3g} GiB",
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
