"""Unitary coupled cluster with singles and doubles in product (Trotter) form."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.ansatz.cluster_product import ORDER_HELP, SinglesOrder, SpinOrbitalProduct
from thalweg.ansatz.excitations import doubles, singles
from thalweg.ansatz.first_order import LARGEST_START
from thalweg.circuit.program import Excitation
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.options import option

__all__ = ["LARGEST_START", "UCCSD"]


class UCCSD(SpinOrbitalProduct):
    """Settings of the UCCSD product (source of the form: Bartlett et al. 1989; Peruzzo et al. 2014)."""

    title: ClassVar[str] = "UCCSD"
    about: ClassVar[str] = "Accurate near equilibrium; fails where several determinants share the weight, as in broken bonds (Peruzzo et al. 2014)."
    groups: ClassVar[str] = "doubles aa, bb, ab act first, then singles a, b"

    key: Literal["uccsd"] = "uccsd"
    order: SinglesOrder = option("doubles-first", "Factor order", ORDER_HELP)

    def excitations(self, hamiltonian: FermionHamiltonian) -> tuple[list[Excitation], list[Excitation]]:
        return doubles(hamiltonian), singles(hamiltonian)
