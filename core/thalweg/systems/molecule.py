"""A molecule: geometry, basis, charge, multiplicity and active space; prepared by a PySCF mean field."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.options import Options, option
from thalweg.systems.prepared import DEFAULT_BUDGET, MeanFieldSeed, PreparedSystem
from thalweg.watch import SILENT, Watch


class Molecule(Options):
    """Settings of a molecular system. Atoms are (symbol, x, y, z) in `unit`."""

    title: ClassVar[str] = "Molecule"
    about: ClassVar[str] = "A geometry with a Gaussian basis set; mean field and integrals are computed."

    key: Literal["molecule"] = "molecule"
    name: str = option("", "Name", "What the system is called in tables and pictures.")
    atoms: tuple[tuple[str, float, float, float], ...] = option((), "Atoms", "Element and Cartesian coordinates of each atom.")
    unit: Literal["angstrom", "bohr"] = option("angstrom", "Unit", "Unit of the coordinates.")
    basis: str = option("sto-3g", "Basis set", "Name of the Gaussian basis set, as the literature writes it.")
    charge: int = option(0, "Charge", "Total charge, in elementary charges.", unit="e", ge=-20, le=20)
    multiplicity: int = option(1, "Multiplicity", "2S + 1: 1 singlet, 2 doublet, 3 triplet.", ge=1, le=20)
    active_space: str = option(
        "all", "Active space", "`all`, `frozen-core`, electrons and orbitals such as `4e,6o`, or a list of orbitals counted from 1 such as `2,3,5-8`."
    )
    cartesian: bool = option(False, "Cartesian functions", "Cartesian instead of spherical d and f functions.", advanced=True)
    point_group: bool = option(True, "Point group", "Use the (Abelian) point group of the geometry.", advanced=True)

    def prepare(self, watch: Watch = SILENT, *, budget_bytes: int = DEFAULT_BUDGET, neighbour: MeanFieldSeed | None = None) -> PreparedSystem:
        """Mean field, integrals and active space.

        The density of `neighbour` (another geometry of the same molecule) seeds the mean field, and its active orbitals are followed.

        Raises StudyError for whatever cannot be computed, with the setting at fault; Stopped when the watch says so.
        """
        from thalweg.systems.molecular import prepare_molecule

        return prepare_molecule(self, watch, budget_bytes, neighbour)
