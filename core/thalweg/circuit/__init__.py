"""Trial states as data: a reference and the factors that act on it."""

from thalweg.circuit.program import Excitation, ExcitationProgram, Gate, GateProgram, Program

__all__ = ["Excitation", "ExcitationProgram", "Gate", "GateProgram", "Program"]
