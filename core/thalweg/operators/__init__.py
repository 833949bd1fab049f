"""Operators as plain read-only data: the fermionic Hamiltonian and the expansion in Pauli strings."""

from thalweg.operators.fermion import FermionHamiltonian, Sector
from thalweg.operators.pauli import PauliExpansion

__all__ = ["FermionHamiltonian", "PauliExpansion", "Sector"]
