"""Optimisers: one file each, each seeing only the `Objective`. The list order is the menu order."""

from thalweg.optimize.adam import Adam
from thalweg.optimize.cobyla import COBYLA
from thalweg.optimize.gradient_descent import GradientDescent
from thalweg.optimize.l_bfgs_b import LBFGSB
from thalweg.optimize.momentum import Momentum
from thalweg.optimize.nelder_mead import NelderMead
from thalweg.optimize.settings import OptimizerSettings
from thalweg.optimize.slsqp import SLSQP
from thalweg.registry import Alternatives

OPTIMIZERS: Alternatives[OptimizerSettings] = Alternatives("optimizer", [LBFGSB, SLSQP, COBYLA, NelderMead, GradientDescent, Momentum, Adam])

__all__ = ["COBYLA", "LBFGSB", "OPTIMIZERS", "SLSQP", "Adam", "GradientDescent", "Momentum", "NelderMead", "OptimizerSettings"]
