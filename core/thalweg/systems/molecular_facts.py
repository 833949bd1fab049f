"""What is said of a prepared molecule: figures, warnings, the orbital ladder, names as the literature writes them."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from thalweg.systems.active_space import ActiveSpace, cut_degeneracies
from thalweg.systems.elements import Element, formula
from thalweg.systems.geometry import short_distance_doubt, shortest_distance
from thalweg.systems.orbital_order import MeanField
from thalweg.systems.prepared import OrbitalRow
from thalweg.units import BOHR_IN_ANGSTROM

if TYPE_CHECKING:
    from thalweg.systems.molecule import Molecule

#: A frontier gap below this makes the reference one of several like determinants, Eh.
_SMALL_GAP = 1e-3


def facts_of(
    spec: Molecule, elements: tuple[Element, ...], mole: Any, field: MeanField, space: ActiveSpace, core_energy: float, dropped: float
) -> dict[str, Any]:
    from pyscf import __version__ as version

    pair = shortest_distance(spec.atoms, spec.unit)
    gap = _gap(field)
    facts: dict[str, Any] = {
        "formula": charged_formula(elements, spec.charge),
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


def warnings_of(spec: Molecule, field: MeanField, space: ActiveSpace) -> tuple[str, ...]:
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


def ladder_of(field: MeanField, space: ActiveSpace) -> tuple[OrbitalRow, ...]:
    active, core = set(space.active), set(space.core)
    irreps = [field.irrep_names[i] if field.irrep_names else "" for i in field.irreps.tolist()]
    return tuple(
        OrbitalRow(p + 1, float(field.energies[p]), float(field.occupation[p]), irreps[p], p in active, p in core) for p in range(field.energies.size)
    )


def charged_formula(elements: tuple[Element, ...], charge: int) -> str:
    size = "" if abs(charge) == 1 else str(abs(charge))
    return formula(tuple(e.symbol for e in elements)) + (f"{size}{'+' if charge > 0 else '-'}" if charge else "")


def _group_title(mole: Any) -> str:
    full = {"Dooh": "D∞h", "Coov": "C∞v", "SO3": "K"}.get(mole.topgroup, mole.topgroup)
    return full if full == mole.groupname else f"{full} (used as {mole.groupname})"


def basis_title(basis: str) -> str:
    """As the literature writes it: STO-3G, 6-31G*, cc-pVDZ, def2-SVP."""
    lower = basis.lower()
    for prefix in ("aug-cc-p", "cc-p", "def2-"):
        if lower.startswith(prefix):
            return prefix + lower[len(prefix) :].upper()
    return basis.upper()
