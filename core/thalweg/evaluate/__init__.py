"""Ways to evaluate the energy: one settings class each, with `offers(structure)` and `source(simulator, rng)`. List order is menu order."""

from thalweg.evaluate.exact import Exact
from thalweg.evaluate.exact_with_error import ExactWithError
from thalweg.evaluate.settings import EvaluationSettings
from thalweg.evaluate.shots import Shots
from thalweg.registry import Alternatives

EVALUATIONS: Alternatives[EvaluationSettings] = Alternatives("evaluation", [Exact, Shots, ExactWithError])

__all__ = ["EVALUATIONS", "EvaluationSettings", "Exact", "ExactWithError", "Shots"]
