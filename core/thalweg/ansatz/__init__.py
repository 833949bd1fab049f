"""Trial states. Each is one options class with `build(ground) -> Program` and `start_parameters(ground, program, rng)`."""

from thalweg.ansatz.coupled_cluster import UCCSD
from thalweg.ansatz.ground import Ground
from thalweg.ansatz.hardware_efficient import HardwareEfficient
from thalweg.options import Options
from thalweg.registry import Alternatives

ANSATZE: Alternatives[Options] = Alternatives("ansatz", [UCCSD, HardwareEfficient])

__all__ = ["ANSATZE", "UCCSD", "Ground", "HardwareEfficient"]
