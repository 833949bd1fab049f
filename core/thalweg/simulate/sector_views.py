"""Views of a sector state: which spin's strings are rows, in which order the columns stand, and the moves between views."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

from thalweg.arrays import FloatArray, IntArray
from thalweg.kernels import sector_pieces as kernels
from thalweg.operators.sector_layout import SectorLayout, StringSpace, reordering_phases, sector_layout, string_space


@dataclass(frozen=True)
class View:
    """Amplitudes with one spin's strings as rows and the other's as columns.

    Attributes:
        rows, columns: the strings.
        irrep: the total irrep.
        rows_are_alpha: which spin the rows belong to.
        last: orbital that counts as the highest in the order of the columns, -1 for the natural order.
    """

    rows: StringSpace
    columns: StringSpace
    irrep: int
    rows_are_alpha: bool
    last: int = -1

    @cached_property
    def layout(self) -> SectorLayout:
        return sector_layout(self.rows, self.columns, self.irrep)

    @cached_property
    def phase(self) -> FloatArray:
        """Sign of each column against the natural order of orbitals, shape (columns,)."""
        return reordering_phases(self.columns, self.last)


def view(alpha: StringSpace, beta: StringSpace, irrep: int, *, rows_are_alpha: bool, last: int = -1) -> View:
    """A view of the sector with these natural string spaces."""
    rows, columns = (alpha, beta) if rows_are_alpha else (beta, alpha)
    if last >= 0:
        columns = string_space(columns.n_orbitals, columns.n_electrons, columns.orbital_irreps, last)
    return View(rows, columns, irrep, rows_are_alpha, last)


class Move:
    """Carries amplitudes from one view to another."""

    def __init__(self, source: View, target: View) -> None:
        old, new = source.layout, target.layout
        self._transposes = source.rows_are_alpha != target.rows_are_alpha
        if self._transposes:
            # a row string of the target is a column of the source, and the other way round
            row_at = source.columns.inverse[target.rows.rank]
            column_at = source.rows.inverse[target.columns.rank]
            self._arguments: tuple[IntArray | FloatArray | int, ...] = (
                target.irrep,
                target.rows.first,
                new.row_start,
                source.columns.local[row_at],
                source.phase[row_at],
                target.columns.first,
                old.row_start[column_at],
                target.phase,
            )
        else:
            place = source.columns.inverse[target.columns.rank]
            phase = target.phase * source.phase[place]
            cycles = kernels.cycles_of(source.columns.local[place], phase, target.columns.first)
            self._arguments = (new.offsets, new.widths, target.irrep, *cycles)

    def __call__(self, psi: FloatArray, spare: FloatArray) -> tuple[FloatArray, FloatArray]:
        """(the moved amplitudes, the array that is free now)."""
        if self._transposes:
            kernels.transpose(psi, spare, *self._arguments)
            return spare, psi
        kernels.permute_columns(psi, *self._arguments)
        return psi, spare
