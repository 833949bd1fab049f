"""A system given by its integrals: an FCIDUMP listing, embedded so that a session runs without the file."""

from __future__ import annotations

from typing import ClassVar, Literal

from thalweg.options import Options, option


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
