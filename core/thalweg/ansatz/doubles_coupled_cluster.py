"""Unitary coupled cluster with doubles alone."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.ansatz.cluster_product import ORDER_HELP, PlainOrder, SpinOrbitalProduct
from thalweg.ansatz.excitations import doubles
from thalweg.circuit.program import Excitation
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.options import option


class UCCD(SpinOrbitalProduct):
    """Settings of the UCCD product (doubles of Bartlett et al. 1989)."""

    title: ClassVar[str] = "UCCD"
    about: ClassVar[str] = "UCCSD without singles: fewer factors; cannot relax the orbitals (Romero et al. 2018)."
    groups: ClassVar[str] = "doubles aa, bb, ab"

    key: Literal["uccd"] = "uccd"
    order: PlainOrder = option("listed", "Factor order", ORDER_HELP)

    def excitations(self, hamiltonian: FermionHamiltonian) -> tuple[list[Excitation], list[Excitation]]:
        return doubles(hamiltonian), []
