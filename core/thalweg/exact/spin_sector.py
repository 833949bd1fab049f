"""The lowest level of a spin Hamiltonian over all its symmetry sectors, with every copy of it and the gap."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from thalweg.errors import StudyError
from thalweg.exact.answer import ExactAnswer
from thalweg.exact.memory import STATE_BYTES
from thalweg.exact.spin_basis import SortedStrings, SpinBasis, basis_of, sector_size, sorted_strings
from thalweg.exact.spin_blocks import Block, OrbitBlock, RegisterBlock, RunsBlock, constant_exchange, orbit_tables, refuse_beyond
from thalweg.exact.spin_diagonal import lowest_basis_states
from thalweg.exact.spin_multiplets import Multiplets, multiplets
from thalweg.exact.spin_search import MAX_COPIES, WORKING_VECTORS, LevelSearch
from thalweg.exact.spin_symmetry import Permutation, symmetry_group
from thalweg.operators.conserved import conserves_parity, conserves_total_spin_along, is_diagonal, is_real
from thalweg.operators.pauli import PauliExpansion
from thalweg.operators.product import product_bytes
from thalweg.watch import Watch


def lowest_level_spins(
    expansion: PauliExpansion,
    *,
    watch: Watch,
    budget_bytes: int,
    translations: Sequence[Permutation] = (),
    target_s_z: float | None = None,
) -> ExactAnswer:
    """The lowest level of H on all states, or on those of one S_z.

    Symmetries are found on the strings themselves: S_z, total spin, spin inversion, and those of `translations` (site
    permutations) that leave H alone. The degeneracy counts all sectors. `vectors` has shape (degeneracy, 2^n), real where H is
    real, and is None where it would take more than half of the budget (`method` then says so).

    Raises StudyError when the states do not fit `budget_bytes` or `target_s_z` is no sector of H, Stopped when asked to stop.
    """
    plan = _Plan.of(expansion, translations, target_s_z, budget_bytes, watch)
    if is_diagonal(expansion):
        return lowest_basis_states(expansion, plan.target_down, watch=watch, budget_bytes=budget_bytes)
    search = LevelSearch(max(expansion.one_norm, 1e-300), budget_bytes, watch)
    sectors = plan.sectors()
    for number, down in enumerate(sectors):
        basis = plan.basis(down)
        for place, count, block in plan.blocks(basis):
            watch.stage(f"Exact diagonalisation: {_place_text(block) or 'all states'}", (number + place / count) / len(sectors))
            search.visit(block)
    return _answer(plan, search)


@dataclass(frozen=True)
class _Plan:
    """Which symmetries are used, and the sectors and blocks that follow."""

    expansion: PauliExpansion
    strings: SortedStrings
    translations: Sequence[Permutation]
    keeps_s_z: bool
    keeps_spin: bool
    keeps_inversion: bool
    target_down: int | None
    budget_bytes: int
    watch: Watch

    @classmethod
    def of(cls, expansion: PauliExpansion, translations: Sequence[Permutation], target: float | None, budget_bytes: int, watch: Watch) -> _Plan:
        keeps_s_z = conserves_total_spin_along(expansion, "z")
        keeps_spin = keeps_s_z and conserves_total_spin_along(expansion, "x")
        down = None if target is None else _down_of(expansion.n_qubits, target, keeps_s_z)
        strings = sorted_strings(expansion)
        keeps_inversion = conserves_parity(expansion, "x")
        return cls(expansion, strings, translations, keeps_s_z, keeps_spin, keeps_inversion, down, budget_bytes, watch)

    def sectors(self) -> list[int | None]:
        """Spins down of each sector visited; mirrored ones and, with total spin conserved, higher S_z follow from these."""
        n = self.expansion.n_qubits
        if not self.keeps_s_z:
            return [None]
        if self.target_down is not None:
            return [self.target_down]
        if self.keeps_spin:
            return [n // 2]
        every: list[int | None] = [*(range(n // 2 + 1) if self.keeps_inversion else range(n + 1))]
        return sorted(every, key=lambda down: abs(2 * (down or 0) - n))

    def is_mirrored(self, basis: SpinBasis) -> bool:
        """Whether the sector stands for the one with S_z reversed as well."""
        return self.keeps_inversion and self.target_down is None and basis.down is not None and 2 * basis.down != basis.n_sites

    def basis(self, down: int | None) -> SpinBasis:
        size = sector_size(self.expansion.n_qubits, down)
        refuse_beyond(size * STATE_BYTES, self.budget_bytes // 2, size)
        return basis_of(self.expansion.n_qubits, down)

    def blocks(self, basis: SpinBasis) -> Iterator[tuple[int, int, Block]]:
        """(number, how many, block) of one sector."""
        half = basis.down is None or 2 * basis.down == basis.n_sites
        real = is_real(self.expansion)
        group = symmetry_group(self.expansion, self.translations, with_inversion=half, real=real)
        direct = basis.down is None or constant_exchange(self.strings) is not None
        if group.characters[0].momentum or not direct:
            try:
                tables = orbit_tables(basis, self.strings, group, self.budget_bytes // 2, self.watch)
            except StudyError:
                if not direct:
                    raise
            else:
                for place, character in enumerate(group.characters):
                    yield place, len(group.characters), OrbitBlock(tables, character, self.watch)
                return
        vectors = WORKING_VECTORS * (8 if real else 16) * basis.dimension
        if basis.down is not None:
            refuse_beyond(STATE_BYTES * basis.dimension + vectors, self.budget_bytes, basis.dimension)
            yield 0, 1, RunsBlock(basis, self.strings, self.watch)
            return
        refuse_beyond(product_bytes(self.expansion) + vectors, self.budget_bytes, basis.dimension)
        halves = (1, -1) if self.keeps_inversion and basis.n_sites > 1 else (0,)
        for place, inversion in enumerate(halves):
            yield place, len(halves), RegisterBlock(basis, self.expansion, inversion, self.watch)


def _answer(plan: _Plan, search: LevelSearch) -> ExactAnswer:
    states, spins = _ground_states(plan, search.ground()), None
    if plan.keeps_spin:
        spins = multiplets(states, with_ladder=plan.target_down is None, watch=plan.watch)
        states = spins.states()
    degeneracy = sum(2 if mirrored else 1 for _, _, mirrored in states)
    vectors = _register_vectors(plan, states, degeneracy)
    return ExactAnswer(
        energy=search.best,
        degeneracy=degeneracy,
        gap=search.gap(),
        vectors=vectors,
        s_squared=spins.s_squared if spins is not None else None,
        method=_method(search, vectors is not None),
        residual=search.ground_residual(),
        remarks=_remarks(search, spins),
    )


def _method(search: LevelSearch, has_vectors: bool) -> str:
    blocks = "one block" if search.n_blocks == 1 else f"{search.n_blocks} symmetry blocks"
    text = f"Lanczos in {blocks} of up to {search.largest:,} states; levels within {search.same:.1e} count as one"
    return text if has_vectors else text + "; the ground states are not kept: on the whole register they would not fit the memory budget"


State = tuple[SpinBasis, Any, bool]  # amplitudes on the basis, and whether the state with S_z reversed counts too


def _ground_states(plan: _Plan, ground: list[tuple[Block, Any]]) -> list[State]:
    """The states in their sectors, real where H is real."""
    states: list[State] = []
    for block, vector in ground:
        whole = block.expand(vector)
        # of a complex pair the conjugate is a second state: real and imaginary part stand for the two
        parts = [np.sqrt(2.0) * whole.real, np.sqrt(2.0) * whole.imag] if block.pairs == 2 else [whole]
        states += [(block.basis, np.ascontiguousarray(part), plan.is_mirrored(block.basis)) for part in parts]
    return states


def _register_vectors(plan: _Plan, states: list[State], degeneracy: int) -> Any | None:
    n = plan.expansion.n_qubits
    dtype = np.result_type(*(vector.dtype for _, vector, _ in states))
    if (degeneracy << n) * dtype.itemsize > plan.budget_bytes // 2:
        return None
    out = np.zeros((degeneracy, 1 << n), dtype=dtype)
    row = 0
    for basis, vector, mirrored in states:
        out[row, basis.register_indices()] = vector
        row += 1
        if mirrored:
            out[row] = out[row - 1, ::-1]  # all bits inverted
            row += 1
    return out


def _remarks(search: LevelSearch, spins: Multiplets | None) -> tuple[str, ...]:
    found = []
    places = dict.fromkeys(_place_text(block) for block, _ in search.ground())
    if any(places):
        found.append(f"Ground space found at {'; '.join(places)}")
    if spins is not None:
        found.append(spins.words())
    if search.has_more:
        found.append(f"The ground space may be larger: the search ended after {MAX_COPIES} copies in one block")
    unconverged = [level.residual for level in search.levels if not level.converged]
    if unconverged:
        found.append(f"Not every level converged: the largest residual is {max(unconverged):.1e}")
    return tuple(found)


def _place_text(block: Block) -> str:
    s_z = block.basis.s_z
    return ", ".join(part for part in ("" if s_z is None else f"S_z = {s_z:g}", block.label) if part)


def _down_of(n: int, s_z: float, keeps_s_z: bool) -> int:
    if not keeps_s_z:
        raise StudyError("S_z cannot be chosen", "this Hamiltonian does not conserve S_z", "Leave S_z open", "target_s_z")
    down = round(0.5 * n - s_z)
    if abs(0.5 * n - s_z - down) > 1e-9 or not 0 <= down <= n:
        raise StudyError(
            f"S_z = {s_z:g} does not fit", f"{n} spins have S_z from {-n / 2:g} to {n / 2:g} in whole steps", "Choose one of these", "target_s_z"
        )
    return down
