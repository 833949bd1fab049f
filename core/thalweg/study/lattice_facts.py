"""What the result of a lattice study says beside the energy: figures per site, the spin of the state, the best bit string."""

from __future__ import annotations

from typing import Any

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.exact.answer import ExactAnswer
from thalweg.operators.conserved import is_diagonal
from thalweg.simulate.engine import Engine
from thalweg.study.problem import Problem
from thalweg.study.result import BestString
from thalweg.systems import LatticeModel
from thalweg.systems.diagonal import best_bits
from thalweg.systems.hubbard import Hubbard


def exact_s_z(problem: Problem, exact: ExactAnswer | None) -> float | None:
    """S_z of the exact ground state of a spin model; None where it is not conserved or the level is degenerate."""
    if exact is None or exact.vectors is None or exact.degeneracy != 1 or problem.prepared.spins is None or problem.encoded.s_z is None:
        return None
    vector = exact.vectors[0]
    return 0.5 * problem.prepared.spins.n_qubits - int(np.argmax(np.abs(vector))).bit_count()


def facts_with_energies(problem: Problem, energy: float, exact: ExactAnswer | None) -> dict[str, Any]:
    """The facts of the system, for a lattice with the energies per site, which stand beside the convention."""
    facts = problem.prepared.facts
    sites = facts.get("sites") if isinstance(problem.spec.system, LatticeModel) else None
    if not sites:
        return facts
    per_site = {"energy per site": energy / sites} | ({} if exact is None else {"exact energy per site": exact.energy / sites})
    return facts | per_site


def best_string(problem: Problem, engine: Engine, parameters: FloatArray) -> BestString | None:
    """The lowest-cost basis state that measurements of the trial state would show; None where the Hamiltonian is no diagonal cost."""
    system, spins = problem.spec.system, problem.prepared.spins
    if not isinstance(system, LatticeModel) or isinstance(system.model, Hubbard) or spins is None or not is_diagonal(spins):
        return None
    bits, cost, weight = best_bits(spins, engine.state(parameters))
    signs, words = problem.encoded.occupation_label(bits), system.model.assignment(bits, system.graph())
    return BestString(bits=signs, energy=cost, weight=weight, words="" if words == signs else words)
