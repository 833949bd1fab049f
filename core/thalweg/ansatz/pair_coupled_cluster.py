"""Unitary coupled cluster with pair doubles."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.ansatz.cluster_product import ORDER_HELP, ClusterProduct, PlainOrder
from thalweg.ansatz.excitations import pair_doubles
from thalweg.circuit.program import Excitation
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.options import option


class PUCCD(ClusterProduct):
    """Settings of the pUCCD product (pair coupled cluster doubles: Stein, Henderson and Scuseria 2014; unitary: Lee et al. 2019)."""

    title: ClassVar[str] = "pUCCD"
    about: ClassVar[str] = "Electron pairs stay together: very few factors; misses all correlation that breaks pairs (Lee et al. 2019)."
    groups: ClassVar[str] = "pair doubles"

    key: Literal["puccd"] = "puccd"
    order: PlainOrder = option("listed", "Factor order", ORDER_HELP)

    def excitations(self, hamiltonian: FermionHamiltonian) -> tuple[list[Excitation], list[Excitation]]:
        return pair_doubles(hamiltonian), []
