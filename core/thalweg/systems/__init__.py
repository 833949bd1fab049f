"""What is studied. Each kind of system is one options class with `prepare(budget_bytes, neighbour) -> PreparedSystem`."""

from thalweg.registry import Alternatives
from thalweg.systems.integrals import Integrals
from thalweg.systems.lattice_model import LatticeModel
from thalweg.systems.molecule import Molecule
from thalweg.systems.prepared import PreparedSystem

SYSTEMS: Alternatives[Molecule | Integrals | LatticeModel] = Alternatives("system", [Molecule, Integrals, LatticeModel])

__all__ = ["SYSTEMS", "Integrals", "LatticeModel", "Molecule", "PreparedSystem"]
