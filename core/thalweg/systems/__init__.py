"""What is studied. Each kind of system is one options class with `prepare(budget_bytes, neighbour) -> PreparedSystem`."""

from thalweg.registry import Alternatives
from thalweg.systems.hubbard import Hubbard
from thalweg.systems.integrals import Integrals
from thalweg.systems.lattice_model import LatticeModel
from thalweg.systems.molecule import Molecule
from thalweg.systems.prepared import PreparedSystem

SYSTEMS: Alternatives[Molecule | Integrals | LatticeModel] = Alternatives("system", [Molecule, Integrals, LatticeModel])


def has_electrons(system: Molecule | Integrals | LatticeModel) -> bool:
    """Whether trial states of electrons suit the system; False for spins."""
    return not isinstance(system, LatticeModel) or isinstance(system.model, Hubbard)


__all__ = ["SYSTEMS", "Integrals", "LatticeModel", "Molecule", "PreparedSystem", "has_electrons"]
