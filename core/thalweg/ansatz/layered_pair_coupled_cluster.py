"""Layers of unitary pair coupled cluster with generalised singles and doubles."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.ansatz.cluster_product import ORDER_HELP, SinglesOrder, SpinOrbitalProduct
from thalweg.ansatz.excitations import generalised_pair_doubles, generalised_singles
from thalweg.ansatz.starts import START_HELP, Start
from thalweg.arrays import FloatArray
from thalweg.circuit.program import Excitation
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.options import option


class KUpCCGSD(SpinOrbitalProduct):
    """Settings of k-UpCCGSD (Lee, Huggins, Head-Gordon and Whaley 2019)."""

    title: ClassVar[str] = "k-UpCCGSD"
    about: ClassVar[str] = "k layers of pair doubles and singles between any orbitals: short, improved by k; has many local minima (Lee et al. 2019)."
    groups: ClassVar[str] = "in each layer generalised pair doubles act first, then generalised singles a, b"
    depth_field: ClassVar[str] = "k"

    key: Literal["k-upccgsd"] = "k-upccgsd"
    k: int = option(2, "Layers k", "Number of layers, each with amplitudes of its own.", ge=1, le=50)
    order: SinglesOrder = option("doubles-first", "Factor order", ORDER_HELP)
    spin_tied: bool = option(True, "Spin-tied amplitudes", "Give mirror-image alpha and beta excitations one shared amplitude.")
    point_group: bool = option(
        False, "Point group", "Keep only totally symmetric excitations: fewer, but those of other irreps are needed to build most doubles."
    )
    start: Start = option("small-random", "Start", START_HELP)

    def layers(self) -> int:
        return self.k

    def excitations(self, hamiltonian: FermionHamiltonian) -> tuple[list[Excitation], list[Excitation]]:
        return generalised_pair_doubles(hamiltonian.n_orbitals), generalised_singles(hamiltonian.n_orbitals)

    def from_shallower(self, parameters: FloatArray, n_parameters: int) -> FloatArray:
        """Parameters that give the state of fewer layers: the new ones, which act last, are the identity."""
        return np.concatenate([parameters, np.zeros(n_parameters - parameters.size)])
