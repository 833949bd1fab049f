"""A model on a lattice: the second kind of system beside molecules."""

from __future__ import annotations

from typing import Annotated, Any, ClassVar, Literal

from pydantic import Field

from thalweg.errors import StudyError
from thalweg.operators.conserved import conserved_quantities
from thalweg.options import Options, option
from thalweg.registry import Alternatives
from thalweg.systems.clauses import Clauses, WeightedCut
from thalweg.systems.hubbard import Hubbard
from thalweg.systems.lattice import AnyLattice, Chain
from thalweg.systems.lattice_graph import LatticeGraph
from thalweg.systems.pauli_list import PauliList
from thalweg.systems.prepared import DEFAULT_BUDGET, MeanFieldSeed, PreparedSystem
from thalweg.systems.spin_model import SpinModel, number
from thalweg.systems.spin_models import J1J2, XXZ, XY, Heisenberg, Ising, Kitaev, RandomCouplings
from thalweg.systems.spin_reference import ReferenceChoice, choose_reference
from thalweg.systems.toric_code import ToricCode
from thalweg.watch import SILENT, Watch

AnyModel = Annotated[
    Heisenberg | J1J2 | XXZ | XY | Ising | Kitaev | ToricCode | RandomCouplings | Hubbard | WeightedCut | Clauses | PauliList,
    Field(discriminator="key"),
]
MODELS: Alternatives[Any] = Alternatives(
    "model", [Heisenberg, J1J2, XXZ, XY, Ising, Kitaev, ToricCode, RandomCouplings, Hubbard, WeightedCut, Clauses, PauliList]
)


class LatticeModel(Options):
    """Settings of a spin or Hubbard model on a lattice."""

    title: ClassVar[str] = "Lattice model"
    about: ClassVar[str] = "Spins, electrons or a discrete cost on the sites of a lattice."

    key: Literal["lattice"] = "lattice"
    name: str = option("", "Name", "What the system is called in tables and pictures.")
    lattice: AnyLattice = option(Chain(), "Lattice", "The sites and the bonds between them.")
    model: AnyModel = option(Heisenberg(), "Model", "What the sites carry and how bonds couple it.")
    reference: ReferenceChoice = option(
        "auto",
        "Reference state",
        "State that a spin circuit starts from: the model's usual one, all up, Neel, all plus, dimer singlets, or a bit string.",
    )
    bits: str = option("", "Bit string", "For the reference `bits`: one sign for each site, site 0 first; 1 is spin down.")
    note: str = option("", "Note", "A remark that is kept with the system, such as where its numbers come from.", advanced=True)

    def graph(self) -> LatticeGraph:
        """The sites that carry a qubit (or an orbital), with bonds, for pictures and tables."""
        return self.lattice.build() if isinstance(self.model, Hubbard) else self.model.graph(self.lattice)

    def prepare(self, watch: Watch = SILENT, *, budget_bytes: int = DEFAULT_BUDGET, neighbour: MeanFieldSeed | None = None) -> PreparedSystem:
        """Builds the Hamiltonian. Raises StudyError for settings that do not fit each other."""
        watch.stage("Building the lattice")
        if isinstance(self.model, Hubbard):
            return self._electrons(self.model, budget_bytes)
        return self._spins(self.model)

    def label(self) -> str:
        return self.name or f"{self.model.title}, {self.graph().name}"

    def energy_unit(self) -> str:
        """The coupling's own symbol while it is 1; otherwise the numbers are in whatever unit the couplings were given in."""
        coupling = self.model.main_coupling()
        return self.model.unit_name if abs(coupling) == 1.0 else f"units of {self.model.unit_name} = 1"

    def _spins(self, model: SpinModel) -> PreparedSystem:
        graph = model.graph(self.lattice)
        expansion = model.hamiltonian(self.lattice)
        reference = choose_reference(self.reference, self.bits, model.usual_reference, graph)
        energy = reference.energy(expansion)
        facts = self._facts(graph, model.convention(), conserved_quantities(expansion), model.uses_second)
        facts |= {"reference state": reference.name, "reference energy per site": energy / graph.n_sites}
        if reference.kind == "bits":
            facts["reference in words"] = model.assignment(reference.bits, graph)
        return PreparedSystem(
            label=self.label(),
            fermions=None,
            spins=expansion,
            energy_unit=self.energy_unit(),
            reference_name=reference.name,
            reference_energy=energy,
            facts=facts,
            reference_bits=reference.bits,
            reference_kind=reference.kind,
            reference_pairs=reference.pairs,
            translations=graph.translations,
        )

    def _electrons(self, model: Hubbard, budget_bytes: int) -> PreparedSystem:
        if self.reference != "auto":
            raise StudyError(
                f"The reference '{self.reference}' is for spins",
                "electrons start from a determinant of the orbitals chosen",
                "Set the reference to `auto`, and the orbitals to `hopping` or `site`",
                "reference",
            )
        graph = self.lattice.build()
        needed = 3 * 8 * graph.n_sites**4
        if needed > budget_bytes:
            raise StudyError(
                "The integrals do not fit the memory budget", f"{needed / 2**30:.3g} GiB are needed", "Use fewer sites or a larger budget", "lattice"
            )
        fermions = model.hamiltonian(graph)
        sector = fermions.sector
        conserved = (f"{sector.n_alpha} up electrons", f"{sector.n_beta} down electrons", "total spin S")
        facts = self._facts(graph, model.convention(), conserved, False)
        facts |= {"electrons": sector.n_electrons, "filling": sector.n_electrons / (2 * graph.n_sites), "S_z": sector.s_z, "orbitals": model.orbitals}
        facts |= {"reference state": model.reference_name(), "reference energy per site": fermions.reference_energy / graph.n_sites}
        return PreparedSystem(
            label=self.label(),
            fermions=fermions,
            spins=None,
            energy_unit=self.energy_unit(),
            reference_name=model.reference_name(),
            reference_energy=fermions.reference_energy,
            facts=facts,
            warnings=model.warnings(graph, fermions),
            translations=graph.translations,
        )

    def _facts(self, graph: LatticeGraph, convention: str, conserved: tuple[str, ...], uses_second: bool) -> dict[str, Any]:
        classes = {kind: count for kind, count in graph.bonds_per_class().items() if uses_second or kind != "second"}
        weights = sorted({b.weight for b in (graph.bonds if uses_second else graph.first_bonds)})
        facts: dict[str, Any] = {"lattice": graph.name, "sites": graph.n_sites}
        if classes:
            facts["bonds"] = ", ".join(f"{count} {kind}" for kind, count in classes.items())
        if weights and weights != [1.0]:
            facts["bond weights"] = f"{number(weights[0])} to {number(weights[-1])}" if len(weights) > 1 else number(weights[0])
        facts["convention"] = convention
        facts["conserved"] = ", ".join(conserved) or "nothing that is looked for"
        notes = graph.notes + (graph.second_notes if uses_second else ())
        if notes:
            facts["what is counted"] = "; ".join(notes)
        if self.note:
            facts["note"] = self.note
        return facts
