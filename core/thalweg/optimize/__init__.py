"""Optimisers: one file each, each seeing only the `Objective`. The list order is the menu order.

One that needs more of the objective than values, gradients and the metric says so in `needs`, and is refused where that is not offered.
"""

from thalweg.optimize.adam import Adam
from thalweg.optimize.cobyla import COBYLA
from thalweg.optimize.conjugate_gradient import ConjugateGradient
from thalweg.optimize.free_axis import FreeAxis
from thalweg.optimize.gcans import GCANS
from thalweg.optimize.gradient_descent import GradientDescent
from thalweg.optimize.icans import ICANS
from thalweg.optimize.imaginary_time import ImaginaryTime
from thalweg.optimize.l_bfgs_b import LBFGSB
from thalweg.optimize.momentum import Momentum
from thalweg.optimize.natural_gradient import NaturalGradient
from thalweg.optimize.nelder_mead import NelderMead
from thalweg.optimize.nesterov import Nesterov
from thalweg.optimize.operator_sampling import OperatorSampling
from thalweg.optimize.sequential_minimal import SequentialMinimal
from thalweg.optimize.settings import OptimizerSettings
from thalweg.optimize.slsqp import SLSQP
from thalweg.optimize.spsa import SPSA
from thalweg.registry import Alternatives

OPTIMIZERS: Alternatives[OptimizerSettings] = Alternatives(
    "optimizer",
    [
        *(LBFGSB, SLSQP, ConjugateGradient),
        *(COBYLA, NelderMead, SPSA, SequentialMinimal, FreeAxis),
        *(GradientDescent, Momentum, Nesterov, Adam),
        *(NaturalGradient, ImaginaryTime),
        *(ICANS, GCANS, OperatorSampling),
    ],
)

__all__ = [
    "COBYLA",
    "GCANS",
    "ICANS",
    "LBFGSB",
    "OPTIMIZERS",
    "SLSQP",
    "SPSA",
    "Adam",
    "ConjugateGradient",
    "FreeAxis",
    "GradientDescent",
    "ImaginaryTime",
    "Momentum",
    "NaturalGradient",
    "NelderMead",
    "Nesterov",
    "OperatorSampling",
    "OptimizerSettings",
    "SequentialMinimal",
]
