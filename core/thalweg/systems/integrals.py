"""A system given by its integrals: an FCIDUMP listing, embedded so that a session runs without the file."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.options import Options, option
from thalweg.systems.prepared import DEFAULT_BUDGET, MeanFieldSeed, PreparedSystem
from thalweg.watch import SILENT, Watch


class Integrals(Options):
    """Settings of a system read from FCIDUMP or from an HDF5 molecular data file."""

    title: ClassVar[str] = "Integrals"
    about: ClassVar[str] = "One- and two-electron integrals from a file; no mean field is computed."

    key: Literal["integrals"] = "integrals"
    name: str = option("", "Name", "What the system is called in tables and pictures.")
    listing: str = option("", "Listing", "The integrals in FCIDUMP form.")
    source: str = option("", "Source", "Name of the file that the integrals were read from.")
    multiplicity: int = option(0, "Multiplicity", "2S + 1; 0 takes MS2 of the listing.", ge=0, le=20)
    active_space: str = option("all", "Active space", "As for molecules; `frozen-core` needs a geometry and is refused here.")
    described: str = option("", "Description", "What the file says of geometry and basis set.", advanced=True)
    stored_energies: tuple[tuple[str, float], ...] = option((), "Stored energies", "Energies that came with the integrals.", unit="Eh", advanced=True)

    def prepare(self, watch: Watch = SILENT, *, budget_bytes: int = DEFAULT_BUDGET, neighbour: MeanFieldSeed | None = None) -> PreparedSystem:
        """Reads the listing, chooses the reference determinant and folds the core. A neighbour is of no use here.

        Raises StudyError for whatever cannot be, with the setting at fault; Stopped when the watch says so.
        """
        from thalweg.systems.from_listing import prepare_integrals

        return prepare_integrals(self, watch, budget_bytes)
