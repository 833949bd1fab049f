"""Trial states. Each is one options class with `build(ground) -> Program` and `start_parameters(ground, program, rng)`.

One whose settings hold a depth names that field in `depth_field` and offers `from_shallower(parameters, n_parameters)`, the
parameters that give the state of one layer less or continue its schedule of angles, so that a depth ladder can climb.
One that needs electrons says `electrons_only`.
"""

from thalweg.ansatz.adaptive import Adaptive
from thalweg.ansatz.alternating_operators import AlternatingOperators
from thalweg.ansatz.coupled_cluster import UCCSD
from thalweg.ansatz.doubles_coupled_cluster import UCCD
from thalweg.ansatz.exchange_layers import ExchangeLayers
from thalweg.ansatz.generalised_coupled_cluster import UCCGSD
from thalweg.ansatz.ground import Ground
from thalweg.ansatz.hardware_efficient import HardwareEfficient
from thalweg.ansatz.layered_pair_coupled_cluster import KUpCCGSD
from thalweg.ansatz.number_conserving import NumberConserving
from thalweg.ansatz.pair_coupled_cluster import PUCCD
from thalweg.options import Options
from thalweg.registry import Alternatives

ANSATZE: Alternatives[Options] = Alternatives(
    "ansatz", [UCCSD, UCCD, UCCGSD, PUCCD, KUpCCGSD, Adaptive, NumberConserving, HardwareEfficient, AlternatingOperators, ExchangeLayers]
)

__all__ = [
    "ANSATZE",
    "PUCCD",
    "UCCD",
    "UCCGSD",
    "UCCSD",
    "Adaptive",
    "AlternatingOperators",
    "ExchangeLayers",
    "Ground",
    "HardwareEfficient",
    "KUpCCGSD",
    "NumberConserving",
]
