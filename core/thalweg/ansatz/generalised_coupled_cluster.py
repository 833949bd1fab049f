"""Unitary coupled cluster with generalised singles and doubles."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.ansatz.cluster_product import ORDER_HELP, SinglesOrder, SpinOrbitalProduct
from thalweg.ansatz.excitations import generalised_doubles, generalised_singles
from thalweg.circuit.program import Excitation
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.options import option


class UCCGSD(SpinOrbitalProduct):
    """Settings of the UCCGSD product (Nooijen 2000; Lee, Huggins, Head-Gordon and Whaley 2019)."""

    title: ClassVar[str] = "UCCGSD"
    about: ClassVar[str] = "Excites between any orbitals: holds in broken bonds; the number of factors grows as the fourth power (Lee et al. 2019)."
    groups: ClassVar[str] = "generalised doubles aa, bb, ab act first, then generalised singles a, b"

    key: Literal["uccgsd"] = "uccgsd"
    order: SinglesOrder = option("doubles-first", "Factor order", ORDER_HELP)

    def excitations(self, hamiltonian: FermionHamiltonian) -> tuple[list[Excitation], list[Excitation]]:
        return generalised_doubles(hamiltonian.n_orbitals), generalised_singles(hamiltonian.n_orbitals)
