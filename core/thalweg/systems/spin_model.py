"""What every spin model offers, and the two conventions that exchange models share."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.errors import StudyError
from thalweg.operators.pauli import PauliExpansion
from thalweg.options import Options, option
from thalweg.systems.lattice_graph import Lattice, LatticeGraph
from thalweg.systems.spin_terms import SpinTerms

Operators = Literal["S.S", "sigma.sigma"]
Sign = Literal["+", "-"]
SIGN_HELP = "Sign in front of J in the sum over bonds: with `+`, J > 0 favours antiparallel spins; with `-`, parallel ones."
OPERATORS_HELP = "`S.S` takes spin operators S = sigma / 2, `sigma.sigma` Pauli matrices: energies differ by up to a factor of 4."


class SpinModel(Options):
    """Base of the spin-1/2 models. Site q of the lattice is qubit q; bit 1 is spin down (Z = -1)."""

    #: Name of the energy unit while the first coupling is 1.
    unit_name: ClassVar[str] = "J"
    #: Product state that `auto` takes: `neel` (with a fallback on frustrated lattices), `plus` or `up`.
    usual_reference: ClassVar[str] = "neel"
    uses_second: ClassVar[bool] = False

    def graph(self, lattice: Lattice) -> LatticeGraph:
        """The sites that the qubits sit on: those of the lattice, unless the model brings its own."""
        return lattice.build()

    def hamiltonian(self, lattice: Lattice) -> PauliExpansion:
        """H on this lattice. Raises StudyError when model and lattice do not fit."""
        return self.on_graph(self.graph(lattice))

    def on_graph(self, graph: LatticeGraph) -> PauliExpansion:
        """H on the sites that `graph` returned."""
        raise AssertionError(f"{type(self).__name__} defines no Hamiltonian")

    def convention(self) -> str:
        """The formula with its numbers, in one line: printed with every energy."""
        raise AssertionError(f"{type(self).__name__} states no convention")

    def main_coupling(self) -> float:
        """The coupling that the energy unit is named after."""
        return 1.0

    def assignment(self, bits: int, graph: LatticeGraph) -> str:
        """A basis state in words."""
        return "".join(str(bits >> q & 1) for q in range(graph.n_sites))


class ExchangeModel(SpinModel):
    """A model with pair couplings in one of the two operator conventions."""

    operators: Operators = option("S.S", "Operators", OPERATORS_HELP)
    sign: Sign = option("+", "Sign of J", SIGN_HELP)

    @property
    def bond_factor(self) -> float:
        """What J is multiplied by to become the coefficient of a product of two Pauli matrices."""
        return (1.0 if self.sign == "+" else -1.0) * (0.25 if self.operators == "S.S" else 1.0)

    @property
    def site_factor(self) -> float:
        return 0.5 if self.operators == "S.S" else 1.0

    def symbol(self, axis: str = "") -> str:
        """`S^z` or `sigma^z`; without an axis the vector."""
        name = "S" if self.operators == "S.S" else "sigma"
        return f"{name}^{axis}" if axis else name

    def product(self, axis: str = "") -> str:
        """`S_i.S_j` or `S^z_i S^z_j` in the convention chosen."""
        return f"{self.symbol(axis)}_i {self.symbol(axis)}_j" if axis else f"{self.symbol()}_i.{self.symbol()}_j"

    def meaning(self) -> str:
        """The end of every convention line."""
        spins = "S = sigma/2" if self.operators == "S.S" else "sigma are Pauli matrices"
        return f"{spins}; J > 0 favours {'antiparallel' if self.sign == '+' else 'parallel'} spins; bond weights multiply J"

    def add_field(self, terms: SpinTerms, axis: str, field: float) -> None:
        """Adds -field sum over sites of the operator along axis (X, Y or Z)."""
        if field:
            for site in range(terms.n_sites):
                terms.site(axis, site, -field * self.site_factor)


def need_bonds(graph: LatticeGraph) -> None:
    """StudyError when there is nothing to couple."""
    if not graph.first_bonds:
        raise StudyError("The lattice has no bonds", f"{graph.name} joins no two sites", "Choose a lattice with bonds", "lattice")


def number(value: float) -> str:
    """A coupling as it stands in formulas: 12 significant digits at most."""
    return f"{value:.12g}"


def signed_sum(sign: Sign, coupling: str, body: str) -> str:
    return f"H = {'' if sign == '+' else '-'}{coupling} sum_<ij> {body}"
