"""Layers of orbital rotations and pair exchanges between neighbouring orbitals."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.ansatz.cluster_product import fermions_of
from thalweg.ansatz.excitations import pair_double
from thalweg.ansatz.ground import Ground
from thalweg.ansatz.starts import PLAIN_START_HELP, PlainStart, start_angles
from thalweg.arrays import FloatArray
from thalweg.circuit.program import Excitation, ExcitationProgram
from thalweg.options import Options, option


class NumberConserving(Options):
    """Settings of the fabric of gates that keep N, S_z and S^2 (Anselmetti, Wierichs, Gogolin and Parrish 2021)."""

    electrons_only: ClassVar[bool] = True
    title: ClassVar[str] = "Number-conserving layers"
    about: ClassVar[str] = "Short local gates that keep electron number and total spin; distant orbitals need many layers (Anselmetti et al. 2021)."
    depth_field: ClassVar[str] = "depth"

    key: Literal["number-conserving"] = "number-conserving"
    depth: int = option(3, "Depth", "Number of layers; a layer joins orbitals 0-1, 2-3 ... and then 1-2, 3-4 ...", ge=1, le=200)
    first: Literal["pair-exchange", "orbital-rotation"] = option(
        "pair-exchange", "Acts first", "Which of the two factors of a pair of orbitals acts first."
    )
    start: PlainStart = option("small-random", "Start", PLAIN_START_HELP)

    def build(self, ground: Ground) -> ExcitationProgram:
        """Two factors with a parameter each for every pair of neighbours in every layer; StudyError for a system without electrons.

        The orbital rotation exp(theta (E_pq - E_qp)) is one single excitation of each spin with a shared angle; they commute.
        """
        hamiltonian = fermions_of(ground, self.title)
        m = hamiltonian.n_orbitals
        bonds = [(p, p + 1) for p in range(0, m - 1, 2)] + [(p, p + 1) for p in range(1, m - 1, 2)]
        excitations: list[Excitation] = []
        parameter: list[int] = []
        labels: list[str] = []
        for layer in range(self.depth):
            for p, q in bonds:
                for kind in self._kinds():
                    factors = [pair_double(p, q)] if kind == "pair exchange" else [Excitation((p,), (q,)), Excitation((), (), (p,), (q,))]
                    excitations += factors
                    parameter += [len(labels)] * len(factors)
                    labels.append(f"{kind} of orbitals {p} and {q} in layer {layer + 1}")
        return ExcitationProgram(
            sector=hamiltonian.sector,
            reference=hamiltonian.reference,
            reference_terms=hamiltonian.reference_terms,
            excitations=tuple(excitations),
            parameter=np.array(parameter, np.int64),
            factor=np.ones(len(excitations)),
            n_parameters=len(labels),
            order=f"{self.depth} times: pairs of orbitals 0-1, 2-3 ..., then 1-2, 3-4 ...; on each {' then '.join(self._kinds())}",
            parameter_labels=tuple(labels),
        )

    def start_parameters(self, ground: Ground, program: ExcitationProgram, rng: np.random.Generator) -> FloatArray:
        """Angles in radians, shape (K,)."""
        return start_angles(self.start, program.n_parameters, rng)

    def from_shallower(self, parameters: FloatArray, n_parameters: int) -> FloatArray:
        """Parameters that give the state of fewer layers: the new ones, which act last, are the identity."""
        return np.concatenate([parameters, np.zeros(n_parameters - parameters.size)])

    def _kinds(self) -> tuple[str, str]:
        kinds = ("pair exchange", "orbital rotation")
        return kinds if self.first == "pair-exchange" else (kinds[1], kinds[0])
