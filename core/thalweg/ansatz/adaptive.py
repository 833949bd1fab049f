"""A trial state that grows: the operators with the largest slopes are appended, and all parameters are searched again."""

from __future__ import annotations

from typing import ClassVar, Literal

import numpy as np

from thalweg.ansatz import pools, string_pools
from thalweg.ansatz.ground import Ground
from thalweg.ansatz.pools import ExcitationPool
from thalweg.ansatz.preparation import reference_program
from thalweg.ansatz.starts import SMALL_WIDTH
from thalweg.ansatz.string_pools import StringPool
from thalweg.arrays import FloatArray
from thalweg.circuit.program import ExcitationProgram, Program
from thalweg.errors import StudyError
from thalweg.operators.fermion import FermionHamiltonian
from thalweg.options import Options, option

FERMIONIC = {"spin-adapted": pools.spin_adapted, "generalised": pools.generalised, "singles-doubles": pools.singles_and_doubles}
ON_QUBITS = {
    "qubit-excitations": string_pools.qubit_excitations,
    "pauli-strings": string_pools.pauli_strings,
    "hamiltonian-terms": string_pools.hamiltonian_terms,
}
PoolKey = Literal["auto", "spin-adapted", "generalised", "singles-doubles", "qubit-excitations", "pauli-strings", "hamiltonian-terms"]
POOL_HELP = (
    "Where operators are taken from. Auto: spin-adapted for electrons, terms of the Hamiltonian for spins. Generalised singles and doubles "
    "that commute with total spin, or of spin orbitals; singles and doubles of the reference; qubit excitations (Yordanov et al. 2021); "
    "their single Pauli strings (Tang et al. 2021); terms of the Hamiltonian and their commutators, for spin models."
)
#: Slopes that agree to this share of the largest count as equal, so that rounding does not choose between them.
COMPARED_DECIMALS = 6


class Adaptive(Options):
    """Settings of adaptive growth (Grimsley, Economou, Barnes and Mayhall 2019)."""

    title: ClassVar[str] = "Adaptive growth"
    about: ClassVar[str] = "Short circuits made for one system, also in broken bonds; costs the slopes of a whole pool a step (Grimsley et al. 2019)."

    key: Literal["adaptive"] = "adaptive"
    pool: PoolKey = option("auto", "Pool", POOL_HELP)
    at_once: int = option(1, "Operators at once", "Number of operators appended in one step, those with the largest slopes.", ge=1, le=100)
    max_operators: int = option(100, "Most operators", "Stop growing at this many operators.", ge=1, le=10_000)
    least_slope: float = option(1e-3, "Least slope", "Stop growing when the slopes of the pool have a smaller norm.", unit="Eh", ge=0)
    at_target: bool = option(True, "Stop at the target", "Stop growing when the error is within the target accuracy.")
    point_group: bool = option(True, "Point group", "Keep only totally symmetric operators in a fermionic pool.")
    start: Literal["zero", "small-random"] = option("zero", "Start", "New parameters are zero, or normal of width 0.1.")

    def build(self, ground: Ground) -> Program:
        """The reference alone: a program without parameters. StudyError where the pool does not fit the system."""
        pool = self.pool_for(ground)
        order = f"operators of the pool `{pool}` act in the order in which they were appended"
        if pool in ON_QUBITS:
            return reference_program(ground, order)
        hamiltonian = self._fermions(ground)
        return ExcitationProgram(
            sector=hamiltonian.sector,
            reference=hamiltonian.reference,
            excitations=(),
            parameter=np.empty(0, np.int64),
            factor=np.empty(0),
            n_parameters=0,
            order=order,
            reference_terms=hamiltonian.reference_terms,
        )

    def operators(self, ground: Ground) -> ExcitationPool | StringPool:
        """The pool. StudyError where it does not fit the system or is too large."""
        if (key := self.pool_for(ground)) in ON_QUBITS:
            return ON_QUBITS[key](ground)
        hamiltonian = self._fermions(ground)
        pool = FERMIONIC[key](hamiltonian)
        return pools.symmetric_part(pool, hamiltonian) if self.point_group else pool

    def choose(self, slopes: FloatArray, barred: tuple[int, ...], smallest: FloatArray | float) -> list[int]:
        """The operators to append, largest slope first, equal ones in the order of the pool; none of those barred.

        `barred` are the operators appended last, whose slope vanishes but for the rest that the search left. `smallest`: what a slope
        must exceed, one number for all or one each.
        """
        sizes = np.abs(slopes)
        sizes[list(barred)] = 0.0
        sizes = np.where(sizes > smallest, sizes, 0.0)
        largest = float(sizes.max(initial=0.0))
        if largest == 0.0:
            return []
        compared = np.round(sizes / largest, COMPARED_DECIMALS)
        order = np.argsort(-compared, kind="stable")[: self.at_once]
        return [int(i) for i in order if sizes[i]]

    def start_parameters(self, ground: Ground, program: Program, rng: np.random.Generator) -> FloatArray:
        """Parameters of a program grown by `program.n_parameters` operators, radians, shape (K,)."""
        if self.start == "zero":
            return np.zeros(program.n_parameters)
        return rng.normal(0.0, SMALL_WIDTH, program.n_parameters)

    def pool_for(self, ground: Ground) -> str:
        """The key of the pool; `auto` fits the system."""
        if self.pool != "auto":
            return self.pool
        return "hamiltonian-terms" if ground.fermions is None else "spin-adapted"

    def _fermions(self, ground: Ground) -> FermionHamiltonian:
        if ground.fermions is None:
            raise StudyError(
                f"The pool `{self.pool}` does not fit this system",
                "its operators move electrons and the system has spins",
                "Choose the pool `auto`, or one for qubits such as `hamiltonian-terms`",
                "ansatz.pool",
            )
        return ground.fermions
