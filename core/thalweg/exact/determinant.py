"""The exact lowest levels of an electron sector: every point-group irrep is searched, so that no lower state is missed."""

from __future__ import annotations

import heapq
import itertools
from collections.abc import Iterator
from dataclasses import dataclass, field, replace

import numpy as np

from thalweg.arrays import FloatArray
from thalweg.errors import StudyError
from thalweg.exact.answer import ExactAnswer
from thalweg.exact.davidson import Eigenpairs, lowest_pairs
from thalweg.exact.memory import FIRST_STATES, determinant_bytes
from thalweg.kernels.spin_strings import small_matrix
from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.operators.sector_hamiltonian import SectorHamiltonian, SymmetryBlock
from thalweg.operators.spin_square import s_squared
from thalweg.watch import SILENT, Watch

#: Blocks up to this size are diagonalised densely.
DENSE_LIMIT = 400
#: Residual norms, Eh: of the first look at every irrep, of a level whose energy alone matters (it errs by the square), and of a converged one.
ROUGH, NEARLY, CONVERGED = 3e-2, 2e-5, 1e-7
#: Levels closer than this are one level, Eh.
SAME_LEVEL = 1e-7
#: <S^2> nearer than this is the same spin.
SAME_SPIN = 0.05
#: Levels that are worked out at most in the search for one of a given spin.
MOST_LEVELS = 64
#: Determinants of lowest energy from which Davidson's guesses are made.
GUESS_SPACE = 100


@dataclass(frozen=True)
class Level:
    """One level of the sector.

    Attributes:
        energy: Eh, core energy included.
        irreps: label of each of its states, as many as its degeneracy.
        vectors: (degeneracy, Na, Nb), strings ascending, orthonormal.
        s_squared: <S^2> of each state.
        residual: the largest |H v - E v|, Eh.
    """

    energy: float
    irreps: tuple[int, ...]
    vectors: FloatArray
    s_squared: tuple[float, ...]
    residual: float


@dataclass
class _Found:
    """What is known of one irrep so far."""

    irrep: int
    block: SymmetryBlock
    pairs: Eigenpairs
    complete: bool = False
    method: str = field(default="")


def lowest_level(
    hamiltonian: FermionHamiltonian,
    *,
    watch: Watch = SILENT,
    budget_bytes: int,
    sector_hamiltonian: SectorHamiltonian | None = None,
    fixed_spin: bool = False,
) -> ExactAnswer:
    """The lowest level of the (N_alpha, N_beta) sector, its degeneracy and the gap to the next.

    With `fixed_spin` the lowest with S = |S_z| instead, the multiplicity that the sector was asked for; the gap is then that to the next
    level of this spin, None where that lies beyond the levels worked out.
    Raises StudyError when the work would not fit the memory budget or no state of the spin is found, Stopped when asked to stop.
    """
    search = _Search(hamiltonian, watch, budget_bytes, sector_hamiltonian)
    if fixed_spin:
        ground, following, remarks = _lowest_of_spin(search, hamiltonian.sector)
    else:
        (ground,), following = search.levels(1)
        remarks = _remarks(hamiltonian, search.product, ground)
    if ground.residual > CONVERGED:
        remarks += (f"The exact level is converged only to a residual of {ground.residual:.1e} Eh.",)
    return ExactAnswer(
        energy=ground.energy,
        degeneracy=len(ground.irreps),
        gap=None if following is None else following - ground.energy,
        vectors=ground.vectors,
        s_squared=ground.s_squared[0],
        method=search.method(ground),
        residual=ground.residual,
        remarks=remarks,
    )


def _lowest_of_spin(search: _Search, sector: Sector) -> tuple[Level, float | None, tuple[str, ...]]:
    """The lowest level with S = |S_z|, the energy of the next one of this spin, and a remark where other spins lie lower."""
    spin = abs(sector.s_z)
    wanted, count = spin * (spin + 1.0), 2
    while True:
        levels, _ = search.levels(count)
        pure = [part for part in (_of_spin(level, wanted) for level in levels) if part is not None]
        if pure:
            break
        if len(levels) < count or count >= MOST_LEVELS:
            name = spin_name(wanted)
            raise StudyError(
                f"No {name} was found", f"none of the {len(levels)} lowest levels is one", "Let the spin of the exact state be `any`", "exact_spin"
            )
        count *= 2
    lower = pure[0].energy - levels[0].energy
    remarks: tuple[str, ...] = ()
    if lower > SAME_LEVEL:
        found = levels[0].s_squared[0]
        remarks = (f"The exact state is the lowest {spin_name(wanted)}; a {spin_name(found)}, S^2 = {found:.2f}, lies {1e3 * lower:.3g} mEh lower.",)
    return pure[0], pure[1].energy if len(pure) > 1 else None, remarks


def _of_spin(level: Level, wanted: float) -> Level | None:
    """The states of the level with this <S^2>; None where there are none."""
    kept = [k for k, square in enumerate(level.s_squared) if abs(square - wanted) < SAME_SPIN]
    if not kept:
        return None
    irreps, squares = tuple(level.irreps[k] for k in kept), tuple(level.s_squared[k] for k in kept)
    return replace(level, irreps=irreps, vectors=level.vectors[kept], s_squared=squares)


def lowest_levels(
    hamiltonian: FermionHamiltonian,
    count: int,
    *,
    watch: Watch = SILENT,
    budget_bytes: int,
    sector_hamiltonian: SectorHamiltonian | None = None,
) -> tuple[Level, ...]:
    """The `count` lowest levels (fewer where the sector has no more), ascending. Raises as `lowest_level`."""
    return _Search(hamiltonian, watch, budget_bytes, sector_hamiltonian).levels(count)[0]


class _Search:
    """Looks roughly at every irrep, then converges those that can hold a wanted level."""

    def __init__(self, hamiltonian: FermionHamiltonian, watch: Watch, budget_bytes: int, product: SectorHamiltonian | None) -> None:
        self._hamiltonian, self._watch = hamiltonian, watch
        self.product = SectorHamiltonian(hamiltonian) if product is None else product
        self._budget_bytes = budget_bytes
        self._refuse_beyond_budget(FIRST_STATES)
        self._found: list[_Found] = []

    def _refuse_beyond_budget(self, states: int) -> None:
        needed, sector = determinant_bytes(self._hamiltonian, states), self._hamiltonian.sector
        if needed > self._budget_bytes:
            raise StudyError(
                "The exact energy does not fit the memory budget",
                f"{sector} make {sector.dimension:,} determinants, which need about {needed / 2**30:.3g} GiB for {states} states of each symmetry",
                "Choose a smaller active space, raise the memory budget, or switch the exact energy off",
                "exact",
            )

    def levels(self, count: int) -> tuple[tuple[Level, ...], float | None]:
        """The lowest levels with all their states, and the energy of the one after them (None where there is none)."""
        wanted = count + 1
        self._refuse_beyond_budget(wanted)
        if not self._found:
            self._look(wanted)
        while True:
            self._converge(wanted, count)
            groups, ceiling = self._groups(count + 1)
            complete = [g for g in groups if g[0][0] < ceiling - SAME_LEVEL][:count]
            exhausted = np.isinf(ceiling)
            if exhausted or (len(complete) == count and len(groups) > count):
                following = groups[len(complete)][0][0] + self._hamiltonian.core_energy if len(groups) > len(complete) else None
                self._finish(complete)
                return tuple(self._level(group) for group in complete), following
            wanted *= 2
            self._refuse_beyond_budget(wanted)

    def method(self, level: Level) -> str:
        names = self._hamiltonian.irrep_names
        irreps = " + ".join(names[g] if g < len(names) else f"irrep {g}" for g in level.irreps)
        kinds = " and ".join(sorted({f.method for f in self._found}))
        where = f"; lowest level in {irreps}" if self.product.n_irreps > 1 else ""
        blocks = f"{len(self._found)} symmetry blocks" if len(self._found) > 1 else "the whole sector"
        return f"{kinds} diagonalisation of {blocks}{where}"

    def _look(self, count: int) -> None:
        for irrep in range(self.product.n_irreps):
            block = self.product.block(irrep)
            if block.layout.size == 0:
                continue
            self._watch.stage("Exact diagonalisation", irrep / self.product.n_irreps)
            if block.layout.size <= DENSE_LIMIT:
                self._found.append(_Found(irrep, block, _dense(block), True, "dense"))
                continue
            guesses = _guesses(block, self._hamiltonian, count)
            pairs = self._solved(block, guesses, np.full(count, ROUGH))
            self._found.append(_Found(irrep, block, pairs, False, "Davidson"))

    def _converge(self, wanted: int, count: int) -> None:
        """Nearly converges `wanted` states in each irrep, in ascending order, until the rest lies above the levels wanted."""
        for found in sorted(self._found, key=lambda f: float(f.pairs.values[0])):
            groups, _ = self._groups(count + 1)
            bound = float(found.pairs.values[0] - found.pairs.residuals[0])
            if len(groups) > count and bound > groups[count][0][0] + SAME_LEVEL:
                continue
            states = min(wanted, found.block.layout.size)
            if found.complete and len(found.pairs.values) >= states:
                continue
            start = found.pairs.vectors
            if len(start) < states:
                start = np.concatenate([start, _guesses(found.block, self._hamiltonian, states)])
            found.pairs = self._solved(found.block, start, np.full(states, NEARLY))
            found.complete = True

    def _finish(self, groups: list[list[tuple[float, int, int]]]) -> None:
        """Converges every state of these levels."""
        for i in {i for group in groups for _, i, _ in group}:
            found = self._found[i]
            tolerances = np.full(len(found.pairs.values), NEARLY)
            tolerances[[k for group in groups for _, j, k in group if j == i]] = CONVERGED
            if np.any(found.pairs.residuals > tolerances):
                found.pairs = self._solved(found.block, found.pairs.vectors, tolerances)

    def _solved(self, block: SymmetryBlock, guesses: FloatArray, tolerances: FloatArray) -> Eigenpairs:
        return lowest_pairs(lambda v: block.apply(v, None, self._watch), block.diagonal, guesses, tolerances, self._watch)

    def _groups(self, limit: int) -> tuple[list[list[tuple[float, int, int]]], float]:
        """The lowest `limit` levels among the converged states, ascending, each a list of (energy, index of irrep, index of state); and a ceiling.

        Above the ceiling some irrep has states that were not worked out; a level at the ceiling may have more of them.
        """
        partial = [f for f in self._found if f.complete and len(f.pairs.values) < f.block.layout.size]
        ceiling = min((float(f.pairs.values[-1]) for f in partial), default=np.inf)
        groups: list[list[tuple[float, int, int]]] = []
        for state in heapq.merge(*(self._states(i) for i, f in enumerate(self._found) if f.complete)):
            if state[0] > ceiling + SAME_LEVEL:
                break
            if groups and state[0] - groups[-1][0][0] < SAME_LEVEL:
                groups[-1].append(state)
            elif len(groups) == limit:
                break
            else:
                groups.append([state])
        return groups, ceiling

    def _states(self, index: int) -> Iterator[tuple[float, int, int]]:
        """(energy, index of irrep, index of state) of one irrep, ascending."""
        return ((float(value), index, k) for k, value in enumerate(self._found[index].pairs.values))

    def _level(self, group: list[tuple[float, int, int]]) -> Level:
        vectors: list[FloatArray] = []
        irreps, squares, residuals = [], [], []
        for i in sorted({i for _, i, _ in group}):
            found = self._found[i]
            members = [k for _, j, k in group if j == i]
            states, s_squares = _pure_spins(found.block, self._hamiltonian.sector, found.pairs.vectors[members])
            vectors += [found.block.layout.to_matrix(state) for state in states]
            squares += s_squares
            irreps += [found.irrep] * len(members)
            residuals += [float(found.pairs.residuals[k]) for k in members]
        lowest = min(float(self._found[i].pairs.values[k]) for _, i, k in group)
        return Level(lowest + self._hamiltonian.core_energy, tuple(irreps), np.stack(vectors), tuple(squares), max(residuals))


def _pure_spins(block: SymmetryBlock, sector: Sector, states: FloatArray) -> tuple[FloatArray, list[float]]:
    """States of one level and one irrep, shape (k, size), turned into eigenstates of S^2, and their <S^2> ascending."""
    states = np.ascontiguousarray(states)
    squares = [s_squared(block, sector, state) for state in states]
    if len(states) == 1:
        return states, squares
    matrix = np.diag(squares)
    for i, j in itertools.combinations(range(len(states)), 2):  # the mixed element from the value in the sum of the two
        both = s_squared(block, sector, (states[i] + states[j]) / np.sqrt(2.0))
        matrix[i, j] = matrix[j, i] = both - 0.5 * (squares[i] + squares[j])
    values, turn = np.linalg.eigh(matrix)
    return np.ascontiguousarray(turn.T @ states), [max(0.0, float(v)) for v in values]


def _dense(block: SymmetryBlock) -> Eigenpairs:
    matrix = block.dense_matrix()
    values, vectors = np.linalg.eigh(matrix)
    residuals = np.linalg.norm(matrix @ vectors - vectors * values, axis=0)
    return Eigenpairs(values, np.ascontiguousarray(vectors.T), residuals)


def _guesses(block: SymmetryBlock, hamiltonian: FermionHamiltonian, count: int) -> FloatArray:
    """Lowest eigenvectors among the determinants of lowest energy, with a little noise so that no spin is left out."""
    order = np.argsort(block.diagonal, kind="stable")[:GUESS_SPACE]
    alphas, betas = block.layout.masks(order)
    _, small = np.linalg.eigh(small_matrix(alphas, betas, np.ascontiguousarray(hamiltonian.one_body), np.ascontiguousarray(hamiltonian.two_body)))
    guesses = np.random.default_rng(1).normal(0.0, 1e-3 / np.sqrt(block.layout.size), (count, block.layout.size))
    guesses[:, order] += small[:, :count].T
    return guesses


def _remarks(hamiltonian: FermionHamiltonian, product: SectorHamiltonian, ground: Level) -> tuple[str, ...]:
    remarks = []
    lowest_spin = abs(hamiltonian.sector.s_z)
    square = ground.s_squared[0]
    if abs(square - lowest_spin * (lowest_spin + 1)) > 0.05:
        remarks.append(f"The lowest state of the sector is a {spin_name(square)}, S^2 = {square:.2f}.")
    if product.reference_irrep not in ground.irreps:
        names = hamiltonian.irrep_names
        here, there = (names[g] if g < len(names) else f"irrep {g}" for g in (ground.irreps[0], product.reference_irrep))
        remarks.append(f"The lowest state of the sector has the symmetry {here}, the reference determinant {there}.")
    return tuple(remarks)


def spin_name(square: float) -> str:
    """`triplet` for S^2 = 2; `state of mixed spin` where S^2 is not S (S + 1) of any S."""
    multiplicity = np.sqrt(1.0 + 4.0 * max(square, 0.0))
    names = ("singlet", "doublet", "triplet", "quartet", "quintet", "sextet", "septet", "octet")
    nearest = round(multiplicity)
    if abs(multiplicity - nearest) > 0.05:
        return "state of mixed spin"
    return names[nearest - 1] if nearest <= len(names) else f"state of multiplicity {nearest}"
